// The form that writes an entry: controls made from the format, checked as one types, kept as a draft, read as a file.
"use strict";
(() => {
  const format = globalThis.handbookFormat;
  const record = globalThis.handbookRecord(format);
  const form = document.getElementById("hb-form");
  const DRAFT = `handbook-form ${location.pathname}`;

  // --- pieces of a page -------------------------------------------------------------------------------------------

  let ids = 0;
  const freshId = () => `hb-f${(ids += 1)}`;

  function element(name, properties = {}, ...children) {
    const made = Object.assign(document.createElement(name), properties);
    made.append(...children);
    return made;
  }

  const button = (text, onclick) => element("button", { type: "button", className: "hb-copy", onclick }, text);
  const lower = (label) => label.replace(/^[A-Z](?=[a-z]+(?![A-Za-z]))/, (letter) => letter.toLowerCase()); // not InChI

  const missing = (label) => ({ says: `${label} missing.`, isMissing: true });

  /** A label, what it means, the control, and room for what is wrong; describes the control by both texts. */
  function fieldAround(field, control, { hint = field.means } = {}) {
    control.id = freshId();
    const hinted = element("p", { className: "hb-field__hint", id: `${control.id}-hint` }, hint);
    const said = element("div", { className: "hb-field__said", id: `${control.id}-said` });
    control.setAttribute("aria-describedby", hint ? `${hinted.id} ${said.id}` : said.id);
    if (field.required) control.setAttribute("aria-required", "true");
    const label = element("label", { htmlFor: control.id }, field.label, ...needOf(field));
    const className = field.wide ? "hb-field hb-field--broad" : "hb-field";
    return { el: element("div", { className }, label, hinted, control, said), said };
  }

  const needOf = (field) => (field.required ? [" ", element("span", { className: "hb-field__need" }, "required")] : []);

  // --- what a node can do -----------------------------------------------------------------------------------------
  // el; value(): for the YAML, undefined where nothing is typed; plain(): for conditions; raw(), load(raw): the draft;
  // review(report, isWanted): tells `report` what is wrong; focus(); say(problem): shows it, or nothing.

  function sayer(said, invalid, put) {
    let shown = "";
    return (problem) => {
      const key = JSON.stringify(problem ?? "");
      if (key === shown) return;
      shown = key;
      said.replaceChildren();
      for (const target of invalid()) {
        if (problem) target.setAttribute("aria-invalid", "true");
        else target.removeAttribute("aria-invalid");
      }
      if (!problem) return;
      said.append(element("p", {}, problem.says));
      if (put && problem.fixes) {
        const offers = problem.fixes.map((fix) => button(`Write ${fix}`, () => put(fix)));
        said.append(element("div", { className: "hb-actions" }, ...offers));
      }
    };
  }

  /** One control with one text. parse(text) gives the value for the YAML; problemOf(text) what is wrong with it. */
  function textNode(field, control, { parse, plain = (text) => text, problemOf, hint }) {
    const { el, said } = fieldAround(field, control, { hint });
    const node = {
      el, field, control, isTouched: false, isAuto: false,
      text: () => control.value.trim(),
      value: () => (node.text() ? parse(node.text()) : undefined),
      plain: () => (node.text() ? plain(node.text()) : undefined),
      raw: () => control.value || undefined,
      load: (raw) => { control.value = String(raw ?? ""); },
      focus: () => control.focus(),
      say: sayer(said, () => [control], (fix) => {
        control.value = fix;
        control.focus();
        changed(node);
      }),
      review(report, isWanted) {
        const problem = node.text() ? problemOf(node.text()) : null;
        if (problem) report(node, problem);
        else if (!node.text() && field.required && isWanted) report(node, missing(field.label));
        else report(node, null);
      },
    };
    control.addEventListener("input", () => {
      node.isAuto = false;
      changed(node);
    });
    control.addEventListener("blur", () => { if (node.text()) afterPress(() => touch(node)); });
    return node;
  }

  /** What a text that names labels is held against: those of the products, and words that stand beside them. */
  const known = (words) => ({ labels: new Set(labelsDefined().map((node) => node.text())), words });

  function leafNode(field) {
    if (field.is === "word") return wordNode(field);
    const control = field.long ? element("textarea", { rows: 2 }) : element("input", { type: "text" });
    control.placeholder = field.example ?? "";
    control.spellcheck = field.is === "text" && !field.pattern && !field.format;
    const isNumber = field.is !== "text";
    if (isNumber) control.inputMode = "decimal";
    const style = field.measures ? "quantity" : isNumber || ["date", "entry"].includes(field.format) ? "plain"
      : ["smiles", "inchi", "ratio"].includes(field.format) ? "quoted" : "text";
    const node = textNode(field, control, {
      parse: (text) => ({ style, text: field.measures ? record.tidy(text) : text }),
      plain: (text) => (isNumber ? Number(text) : text),
      problemOf: (text) => record.problem(field, text, field.format === "ratio" ? known() : {}) ?? labelTwice(node, text),
    });
    return node;
  }

  function labelTwice(node, text) {
    const isTwice = node.field.format === "label" && labelsDefined().find((other) => other.text() === text) !== node;
    return isTwice ? { says: `The label ${text} is taken.` } : null;
  }

  function wordNode(field) {
    const control = element("select");
    for (const word of field.has_preset ? field.words : ["", ...field.words]) {
      control.append(element("option", { value: word }, word || "–"));
    }
    return textNode(field, control, {
      parse: (text) => ({ style: field.flag || /^\d+$/.test(text) ? "plain" : "text", text }),
      plain: (text) => (field.flag ? text === "true" : /^\d+$/.test(text) ? Number(text) : text),
      problemOf: () => null,
    });
  }

  // --- lists ------------------------------------------------------------------------------------------------------

  const SEPARATED = ["person", "label", "entry"];

  function listNode(field) {
    if (field.of.is === "part") return groupsNode(field);
    if (field.of.is === "word") return wordsNode(field);
    const isShort = SEPARATED.includes(field.of.format);
    const control = isShort ? element("input", { type: "text" }) : element("textarea", { rows: 3 });
    control.placeholder = isShort ? field.of.example : "";
    const split = (text) => text.split(isShort ? /[,;\s]+/ : /\n/).map((each) => each.trim()).filter(Boolean);
    const style = field.of.format === "entry" ? "plain" : "text";
    return textNode(field, control, {
      hint: `${field.means}; ${isShort ? "several with commas between" : "one a line"}`,
      parse: (text) => ({ items: split(text).map((each) => ({ style, text: each })) }),
      plain: split,
      problemOf: (text) => {
        const items = split(text), twice = items.find((item, at) => items.indexOf(item) < at);
        const context = field.of.format === "label" ? known(field.words) : {};
        if (twice && isShort) return { says: `${twice} stands twice.` };
        if (field.names_of) return unnamed(field, items);
        return items.map((item) => record.problem(field.of, item, context)).find(Boolean) ?? null;
      },
    });
  }

  /** What is said where an item is the name of none of the substances that stand under the keys field.names_of. */
  function unnamed(field, items) {
    const names = field.names_of.flatMap((key) => tops.get(key).plain() ?? []).map((each) => each.name).filter(Boolean);
    const odd = items.find((item) => !names.includes(item));
    const known = names.length ? `write ${names.join(", ")}` : "name them first";
    return odd === undefined ? null : { says: `“${odd}” is not the name of a substance above: ${known}.` };
  }

  function wordsNode(field) {
    const name = freshId(), said = element("div", { className: "hb-field__said", id: `${name}-said` });
    const boxes = field.of.words.map((word) => element("input", { type: "checkbox", value: word, id: freshId() }));
    const labelOf = (box) => element("label", { className: "hb-choice", htmlFor: box.id }, box, ` ${box.value}`);
    const choices = boxes.map(labelOf);
    const legend = element("legend", {}, field.label, ...needOf(field));
    const hint = element("p", { className: "hb-field__hint", id: `${name}-hint` }, field.means);
    const isLong = boxes.length > 9;
    const el = element("fieldset", { className: "hb-field hb-field--wide" }, legend, hint,
      element("div", { className: isLong ? "hb-choices hb-choices--columns" : "hb-choices" }, ...choices), said);
    el.setAttribute("aria-describedby", `${hint.id} ${said.id}`);
    let order = []; // as they were ticked: the first is the most important
    const chosen = () => order;
    const node = {
      el, field, isTouched: false,
      value: () => (chosen().length ? { items: chosen().map((text) => ({ style: "text", text })) } : undefined),
      plain: () => (chosen().length ? chosen() : undefined),
      raw: () => (chosen().length ? chosen() : undefined),
      load(raw) {
        order = [].concat(raw ?? []);
        for (const box of boxes) box.checked = order.includes(box.value);
      },
      focus: () => boxes[0].focus(),
      say: sayer(said, () => []),
      review: (report, isWanted) =>
        report(node, !chosen().length && field.required && isWanted ? missing(field.label) : null),
    };
    for (const box of boxes) {
      box.setAttribute("aria-describedby", said.id);
      box.addEventListener("change", () => {
        order = [...order.filter((word) => word !== box.value), ...(box.checked ? [box.value] : [])];
        changed(node);
      });
    }
    return node;
  }

  /** Points of a time course: a line each, its numbers apart by spaces. */
  function pointsNode(field) {
    const lines = (text) => text.trim().split(/\s*\n\s*/).map((line) => line.split(/[\s;|]+/));
    const pointOf = (numbers) => ({ items: numbers.map((text) => ({ style: "plain", text })) });
    return textNode({ ...field, example: "" }, element("textarea", { rows: 4, placeholder: "0 0\n2 6.4" }), {
      hint: `${field.means}; one point a line`,
      parse: (text) => ({ isData: true, items: lines(text).map(pointOf) }),
      plain: (text) => lines(text).map((point) => point.map(Number)),
      problemOf: (text) => {
        const points = lines(text), times = points.map(([time]) => Number(time));
        const odd = points.find((point) => point.length !== field.of.length);
        if (odd) return { says: `“${odd.join(" ")}” is not ${field.of.length} numbers.` };
        const found = points.flatMap((point) => point.map((each, at) => record.problem(field.of[at], each)));
        const wrong = found.find(Boolean);
        if (wrong) return { says: wrong.says };
        if (points.length < 2) return { says: "Write at least two points." };
        const isBack = times.some((time, at) => time <= times[at - 1]);
        return isBack ? { says: "Write the points in the order of time." } : null;
      },
    });
  }

  /** A list of parts, each of which can be taken out again. */
  function groupsNode(field, { isShown = () => true, extra = [] } = {}) {
    const name = `${field.one[0].toUpperCase()}${field.one.slice(1)}`;
    const items = [], list = element("div", { className: "hb-groups" });
    const said = element("div", { className: "hb-field__said" });
    const add = button(`Add a ${field.one}`, () => {
      const item = grow();
      changed(item);
      item.focus();
    });
    const legend = element("legend", {}, field.label, ...needOf(field));
    const hint = element("p", { className: "hb-field__hint" }, field.means);
    const body = element("div", {}, list, said, add);
    const el = element("fieldset", { className: "hb-part" }, legend, hint, ...extra, body);

    function number() {
      items.forEach((item, at) => {
        item.legend.textContent = `${name} ${at + 1}`;
        item.remove.setAttribute("aria-label", `Remove ${field.one} ${at + 1}`);
      });
    }

    function grow(raw) {
      const item = partNode({ ...field.of, label: name, required: true, isItem: true });
      item.remove = button("Remove", () => {
        items.splice(items.indexOf(item), 1);
        item.el.remove();
        number();
        add.focus();
        announce(`${name} removed`);
        changed(node);
      });
      item.el.append(item.remove);
      items.push(item);
      list.append(item.el);
      number();
      if (raw) item.load(raw);
      else item.letter();
      return item;
    }

    const filled = () => items.filter((item) => item.value());
    const node = {
      el, field, body, items, grow,
      value: () => (isShown() && filled().length ? { items: filled().map((item) => item.value()) } : undefined),
      plain: () => (isShown() && filled().length ? filled().map((item) => item.plain()) : undefined),
      raw: () => items.map((item) => item.raw()),
      load(raw) {
        for (const item of items.splice(0)) item.el.remove();
        for (const each of raw ?? []) grow(each);
      },
      focus: () => (items[0] ?? { focus: () => add.focus() }).focus(),
      say: sayer(said, () => []),
      review(report, isWanted) {
        report(node, null);
        if (!isShown()) return;
        items.forEach((item, at) => {
          const isFirst = at === 0 && field.required && isWanted && !filled().length;
          item.review(report, Boolean(item.value()) || isFirst);
        });
        if (!items.length && field.required && isWanted) report(node, missing(name));
      },
    };
    return node;
  }

  /** Parts, or a word that stands in their place. */
  function choiceNode(field) {
    const control = element("select", {}, element("option", { value: "" }, "substances, listed below"),
      ...field.words.map((word) => element("option", { value: word }, `the word “${word}”`)));
    const given = { ...field, required: false, label: "Given as", means: "" };
    const word = textNode(given, control, { parse: String, problemOf: () => null });
    const groups = groupsNode(field, { isShown: () => !word.text(), extra: [word.el] });
    const show = () => { groups.body.hidden = Boolean(word.text()); };
    control.addEventListener("input", show);
    return {
      ...groups,
      value: () => (word.text() ? { style: "text", text: word.text() } : groups.value()),
      plain: () => word.text() || groups.plain(),
      raw: () => ({ word: word.raw(), items: groups.raw() }),
      load(raw) {
        word.load(raw?.word);
        groups.load(raw?.items);
        show();
      },
    };
  }

  /** Texts, a line each, and parts behind them in one list. */
  function mixedNode(field) {
    const texts = listNode({ ...field, of: field.text });
    const parts = groupsNode({ ...field, label: `${field.label}: ${field.one}s`, means: "", required: false });
    const all = () => [texts, parts].flatMap((node) => node.value()?.items ?? []);
    return {
      el: element("div", {}, texts.el, parts.el), field,
      value: () => (all().length ? { items: all() } : undefined),
      plain: () => (all().length ? all() : undefined),
      raw: () => ({ text: texts.raw(), items: parts.raw() }),
      load(raw) {
        texts.load(raw?.text);
        parts.load(raw?.items);
      },
      focus: texts.focus, say: texts.say,
      review(report, isWanted) {
        texts.review(report, isWanted);
        parts.review(report, isWanted);
      },
    };
  }

  // --- parts ------------------------------------------------------------------------------------------------------

  const NODES = { part: partNode, list: listNode, choice: choiceNode, mixed: mixedNode, points: pointsNode };
  const nodeOf = (field) => (NODES[field.is] ?? leafNode)(field);

  function partNode(field) {
    const about = format.parts[field.part];
    const { fields } = about;
    const nodes = new Map(fields.map((each) => [each.key, nodeOf(each)]));
    const inLine = [], folded = [];
    for (const each of fields) (each.seldom ? folded : inLine).push(nodes.get(each.key).el);
    const said = element("div", { className: "hb-field__said" });
    const grid = element("div", { className: "hb-fields" }, ...inLine);
    const legend = element("legend", {}, field.label);
    const more = folded.length ? [foldedFields(fields, folded)] : [];
    const isFolded = !field.required && !field.isItem;
    const body = [grid, ...more, said];
    const el = isFolded ? element("details", { className: "hb-more hb-part" }, summaryOf(field), ...body)
      : field.isItem ? element("fieldset", { className: "hb-part" }, legend, ...body)
        : element("div", {}, ...body);
    const what = about.exactly && choiceOfKind(about, fields, nodes, grid);
    const isRead = (key) => !nodes.get(key).el.hidden;
    const shown = () => [...nodes].filter(([key]) => isRead(key));
    const given = (read) => shown().map(([key, each]) => [key, read(each)]).filter(([, value]) => value !== undefined);
    const isEmpty = () => shown().every(([, each]) => each.isAuto || each.value() === undefined);
    const autos = () => [...nodes.keys()].filter((key) => nodes.get(key).isAuto);
    const node = {
      el, field, legend, nodes,
      value: () => (isEmpty() ? undefined : { keys: given((each) => each.value()) }),
      plain: () => (isEmpty() ? undefined : Object.fromEntries(given((each) => each.plain()))),
      raw: () => ({ ...Object.fromEntries([...nodes].map(([key, each]) => [key, each.raw()])), "?": what?.raw(), "!": autos() }),
      load(raw) {
        for (const [key, each] of nodes) if (raw?.[key] !== undefined) each.load(raw[key]);
        for (const key of raw?.["!"] ?? []) nodes.get(key).isAuto = true;
        if (what && raw?.["?"]) what.choose(raw["?"]);
        if (isFolded && !isEmpty()) el.open = true;
        const isUsed = fields.some((each) => each.seldom && nodes.get(each.key).value() !== undefined);
        for (const fold of more) fold.open = isUsed;
      },
      focus: () => (what ?? nodes.get(fields[0].key)).focus(),
      say: sayer(said, () => []),
      letter() {
        const label = fields.find((each) => each.format === "label");
        if (!label) return;
        const used = new Set(labelsDefined().map((each) => each.text()));
        nodes.get(label.key).load([..."ABCDEFGHIJKLMNOPQRSTUVWXYZ"].find((letter) => !used.has(letter)) ?? "");
        nodes.get(label.key).isAuto = true;
      },
      review(report, isWanted) {
        const isAsked = (isWanted && !isFolded) || !isEmpty();
        for (const [key, each] of shown()) each.review(report, isAsked && !about.exactly?.includes(key));
        report(node, null);
        if (!isAsked) return;
        if (what) return what.review(report, nodes);
        reviewConditions(about, node, report);
        openAfter(fields, nodes);
      },
    };
    return node;
  }

  function foldedFields(fields, folded) {
    const names = fields.filter((each) => each.seldom).map((each) => lower(each.label));
    const summary = element("summary", {}, `More: ${names.join(", ")}`);
    return element("details", { className: "hb-more hb-form__more" }, summary, element("div", { className: "hb-fields" }, ...folded));
  }

  const summaryOf = (field) =>
    element("summary", {}, field.label, element("span", { className: "hb-field__hint" }, ` ${field.means}`));

  /** Tells which keys a part lacks by the conditions of the schema, beside the first of them. */
  function reviewConditions(about, node, report) {
    const plain = node.plain() ?? {};
    for (const condition of about.conditions ?? []) {
      const lack = record.lacking(condition, plain);
      const keys = lack?.keys.filter((key) => node.nodes.has(key)) ?? [];
      if (!keys.length) continue;
      const [first, ...others] = keys.map((key) => node.nodes.get(key).field.label);
      const labels = [first, ...others.map(lower)], last = labels.length > 1 ? labels.pop() : null;
      const joined = labels.join(", ") + (last ? ` ${lack.how === "any" ? "or" : "and"} ${last}` : "");
      const isTooMuch = lack.how === "not";
      report(node.nodes.get(keys[0]), isTooMuch ? { says: `Leave out ${lower(joined)}, or what excludes it.` } : missing(joined));
    }
  }

  /** Unfolds the parts that belong to a word once it is chosen. */
  function openAfter(fields, nodes) {
    for (const { key, opens_after: after } of fields) {
      const node = nodes.get(key);
      const isSaid = ([other, words]) => nodes.get(other).plain()?.some((word) => words.includes(word));
      const isDue = Object.entries(after ?? {}).some(isSaid);
      if (isDue && !node.wasOpened) node.el.open = node.wasOpened = true;
    }
  }

  /** Exactly one of several keys: a choice of which, and only the fields that go with it. */
  function choiceOfKind(about, fields, nodes, grid) {
    const labels = about.exactly.map((key) => [key, fields.find((each) => each.key === key).label]);
    const control = element("select", {}, ...labels.map(([value, label]) => element("option", { value }, label)));
    const { el } = fieldAround({ label: "What was measured", means: "one a line", required: true }, control);
    grid.prepend(el);
    const show = () => {
      for (const each of fields) {
        const goesWith = about.exactly.includes(each.key) ? [each.key] : each.only_for;
        nodes.get(each.key).el.hidden = Boolean(goesWith && !goesWith.includes(control.value));
      }
    };
    control.addEventListener("input", () => {
      show();
      changed(nodes.get(control.value));
    });
    show();
    return {
      raw: () => control.value,
      choose: (key) => {
        control.value = key;
        show();
      },
      focus: () => control.focus(),
      review(report) {
        const node = nodes.get(control.value);
        if (!node.text()) report(node, missing(node.field.label));
        for (const condition of about.conditions ?? []) {
          const seen = [...nodes].filter(([, each]) => !each.el.hidden).map(([key, each]) => [key, each.plain()]);
          const lack = record.lacking(condition, { ...Object.fromEntries(seen), [control.value]: node.text() });
          for (const key of lack?.keys ?? []) report(nodes.get(key), missing(nodes.get(key).field.label));
        }
      },
    };
  }

  // --- the whole --------------------------------------------------------------------------------------------------

  const fields = format.parts[format.record].fields;
  const tops = new Map();
  const place = document.getElementById("hb-form-fields");
  const contents = document.querySelector("#hb-form-contents ul");

  function* leaves(node) {
    if (!node) return;
    if (node.nodes) for (const each of node.nodes.values()) yield* leaves(each);
    else if (node.items) for (const each of node.items) yield* leaves(each);
    else yield node;
  }

  function labelsDefined() {
    const all = [...tops.values()].flatMap((node) => [...leaves(node)]);
    return all.filter((node) => node.field.format === "label" && node.text());
  }

  for (const section of format.sections) {
    const title = element("h2", { id: section.id }, section.title);
    const folded = () => element("details", { className: "hb-more" }, element("summary", {}, "Seldom needed for a first draft"));
    const body = section.folded ? folded() : element("div");
    if (section.lead) body.append(element("p", { className: "hb-detail" }, section.lead));
    const grid = element("div", { className: "hb-fields" });
    for (const key of section.keys) {
      const node = nodeOf(fields.find((each) => each.key === key));
      tops.set(key, node);
      grid.append(node.el);
      if (node.field.label === section.title) node.el.classList.add("hb-part--titled");
    }
    body.append(grid);
    const el = element("section", {}, title, body);
    el.setAttribute("aria-labelledby", section.id);
    place.append(el);
    contents.append(element("li", {}, element("a", { href: `#${section.id}` }, section.title)));
  }
  contents.append(element("li", {}, element("a", { href: "#finish" }, "Check and download")));

  let entry = record.mint();

  function written() {
    const keys = [];
    for (const field of fields) {
      // What no section holds the form sets itself: the version of the format, the entry, the first revision.
      const set = () => ({ style: "plain", text: field.text ?? (field.format === "entry" ? entry : String(field.least)) });
      const value = tops.has(field.key) ? tops.get(field.key).value() : set();
      if (value !== undefined) keys.push([field.key, value]);
    }
    return record.yaml({ keys });
  }

  // The record as a part, for its required keys and conditions.
  const whole = { nodes: tops, field: {}, plain: () => Object.fromEntries([...tops].map(([key, node]) => [key, node.plain()])) };

  let isAttempted = false; // the file was asked for, so what is missing is shown beside its field
  let isWarned = false; // what is doubtful was told, and nothing has changed since
  let problems = [];

  function review() {
    const found = new Map();
    const report = (node, problem) => { if (problem || !found.has(node)) found.set(node, problem); };
    for (const node of tops.values()) node.review(report, Boolean(node.field.required));
    reviewConditions(format.parts[format.record], whole, report);
    problems = [...found].filter(([, problem]) => problem).map(([node, problem]) => ({ node, ...problem }));
    for (const [node, problem] of found) {
      const isShown = problem && (isAttempted || (node.isTouched && !problem.isMissing));
      node.say(isShown ? problem : null);
    }
    summarise();
  }

  const path = (node) => {
    const around = node.el.parentElement?.closest("fieldset")?.querySelector("legend")?.textContent;
    const section = node.el.closest("section")?.querySelector("h2")?.textContent;
    return [...new Set([section, around?.replace(/ required$/, "")])].filter(Boolean).join(", ");
  };

  function reach(node) {
    for (let at = node.el; at; at = at.parentElement) if (at.tagName === "DETAILS") at.open = true;
    node.focus();
  }

  function summarise() {
    for (const [id, isMissing] of [["hb-form-mend", false], ["hb-form-missing", true]]) {
      const some = problems.filter((problem) => Boolean(problem.isMissing) === isMissing);
      const list = document.getElementById(id);
      list.hidden = !some.length;
      list.querySelector("ul").replaceChildren(...some.map(({ node, says }) => {
        const link = element("a", { href: `#${node.el.querySelector("[id]")?.id ?? ""}` }, `${path(node)}: ${says}`);
        link.addEventListener("click", (event) => {
          event.preventDefault();
          reach(node);
        });
        return element("li", {}, link);
      }));
    }
    const open = problems.filter((problem) => problem.isMissing).length, wrong = problems.length - open;
    const counts = [wrong && `${wrong} to mend`, open && `${open} to fill in`].filter(Boolean).join(", ");
    for (const state of document.querySelectorAll("[data-form-state]")) state.textContent = counts || "Ready to download";
    const text = written();
    document.getElementById("hb-form-yaml").textContent = text;
    document.getElementById("hb-form-copy").dataset.copy = text;
    for (const name of document.querySelectorAll("[data-form-entry]")) name.textContent = entry;
  }

  const status = document.getElementById("hb-form-status");
  const announce = (text) => { status.textContent = text; };

  let waiting = 0;

  /** A node's text has changed: what was shown of it is looked at at once, what is new after a pause. */
  function changed(node) {
    isWarned = false;
    keep();
    review();
    clearTimeout(waiting);
    waiting = setTimeout(() => afterPress(() => touch(node)), 900);
  }

  // What is said of a field moves what stands below it: not while a button, a box or a link there is being pressed.
  let isPressed = false;
  const delayed = [];

  function afterPress(act) {
    if (isPressed) delayed.push(act);
    else act();
  }

  function released() {
    isPressed = false;
    for (const act of delayed.splice(0)) act();
  }

  // A finger presses twice: as a pointer, then as the mouse it stands for. A list that opens may swallow the release.
  for (const kind of ["pointerdown", "mousedown"]) addEventListener(kind, () => { isPressed = true; }, true);
  for (const kind of ["pointerup", "pointercancel", "mouseup", "keydown", "input"]) {
    addEventListener(kind, () => { if (isPressed) setTimeout(released); }, true); // the click comes first
  }

  function touch(node) {
    const isNew = !node.isTouched;
    node.isTouched = true;
    review();
    const problem = problems.find((each) => each.node === node && !each.isMissing);
    if (problem) announce(`${node.field.label}: ${problem.says}`);
    else if (!isNew) announce("");
  }

  // --- the draft --------------------------------------------------------------------------------------------------

  function keep() {
    const raw = Object.fromEntries([...tops].map(([key, node]) => [key, node.raw()]));
    try {
      localStorage.setItem(DRAFT, JSON.stringify({ entry, raw }));
    } catch {
      announce("This browser does not let the page keep a draft.");
    }
  }

  function kept() {
    try {
      return JSON.parse(localStorage.getItem(DRAFT));
    } catch {
      return null;
    }
  }

  const draft = kept();
  if (draft) {
    entry = draft.entry;
    for (const [key, node] of tops) {
      try {
        if (draft.raw[key] !== undefined) node.load(draft.raw[key]);
      } catch {
        announce(`${node.field.label} was kept by an earlier version of the form and cannot be shown.`);
      }
    }
  } else {
    // One of each kind that nearly every record has stands ready.
    for (const node of [...tops.values()].flatMap((top) => [top, ...(top.nodes?.values() ?? [])])) {
      if (node.grow && (node.field.required || node.field.starts)) node.grow();
    }
  }

  document.getElementById("hb-form-redraw").addEventListener("click", () => {
    entry = record.mint();
    keep();
    review();
    announce(`The entry is now ${entry}`);
  });

  document.getElementById("hb-form-discard").addEventListener("click", () => {
    if (!confirm("Discard everything typed into this form?")) return;
    localStorage.removeItem(DRAFT);
    location.reload();
  });

  // --- the file ---------------------------------------------------------------------------------------------------

  form.addEventListener("submit", (event) => {
    event.preventDefault();
    isAttempted = true;
    review();
    const summary = document.getElementById("hb-form-summary");
    const isDoubtful = problems.length > 0 && problems.every((problem) => problem.isDoubt);
    if (problems.length && !(isDoubtful && isWarned)) {
      isWarned = isDoubtful;
      const count = `${problems.length} to see to before the download`;
      announce(isDoubtful ? "If it is right all the same, press Download again" : count);
      document.getElementById("hb-form-doubt").hidden = !isDoubtful;
      summary.focus();
      return;
    }
    const address = URL.createObjectURL(new Blob([written()], { type: "application/yaml" }));
    const link = element("a", { href: address, download: `${entry}.yml`, hidden: true });
    document.body.append(link);
    link.click();
    link.remove();
    setTimeout(() => URL.revokeObjectURL(address), 10_000);
    announce(`${entry}.yml downloaded`);
  });

  // Enter in a line of text moves nothing: a file half filled in is not what was meant.
  form.addEventListener("keydown", (event) => {
    if (event.key === "Enter" && event.target.matches("input")) event.preventDefault();
  });

  form.hidden = false;
  document.querySelector("[data-form-without]").hidden = true;
  for (const part of document.querySelectorAll("[data-form-part]")) part.hidden = false;
  review();
})();
