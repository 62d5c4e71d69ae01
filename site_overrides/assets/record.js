// A record as one writes it: what is wrong with a text as typed, fresh identifiers, and the YAML of it all. No DOM.
// Keys, words, units, patterns and conditions come from the format (form-data.js, made from the JSON Schema); here
// stands only how they are used.
"use strict";
globalThis.handbookRecord = (format) => {
  const { aids, identifier } = format;

  // --- identifiers ------------------------------------------------------------------------------------------------

  const ALPHABET = "0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZ"; // of ISO 7064 MOD 37,36

  function checkCharacter(body) {
    let sum = 36;
    for (const letter of body) {
      sum = (sum + ALPHABET.indexOf(letter)) % 36 || 36;
      sum = (sum * 2) % 37;
    }
    return ALPHABET[(37 - sum) % 36];
  }

  const taken = new Set(identifier.taken.match(/.{9}/g));

  /** A fresh identifier; drawn again where the check character is none of its letters, or the book has it. */
  function mint(random = (count) => crypto.getRandomValues(new Uint8Array(count))) {
    for (;;) {
      const { prefix, letters, drawn } = identifier;
      const body = prefix + Array.from(random(drawn), (byte) => letters[byte % letters.length]).join("");
      const minted = body + checkCharacter(body);
      if (letters.includes(minted.at(-1)) && !taken.has(minted)) return minted;
    }
  }

  // --- quantities -------------------------------------------------------------------------------------------------

  const escaped = (text) => text.replace(/[.*+?^${}()|[\]\\/]/g, "\\$&");
  const tidy = (text) => text.trim().replace(/\s+/g, " ").replace(/[\u2212\u2010-\u2013]/g, "-").replace(/\u03bc/g, "µ");
  const NUMBER = "[+-]?(?:[0-9]+(?:\\.[0-9]*)?|\\.[0-9]+)(?:[eE][+-]?[0-9]+)?";
  const spellings = new Map();
  for (const [dimension, units] of Object.entries(aids.units)) {
    const known = units.flatMap((unit) => unit.spellings.map((spelling) => [spelling, unit]));
    spellings.set(dimension, new Map(known));
  }
  const symbols = (control) => control.measures.flatMap((each) => aids.units[each].map((unit) => unit.symbol));
  const unitOf = (control, spelling) => control.measures.map((each) => spellings.get(each).get(spelling)).find(Boolean);
  const listed = (words) => (words.length > 1 ? `${words.slice(0, -1).join(", ")} or ${words.at(-1)}` : words[0]);
  const isBeyondMeasure = (number) =>
    number.length > aids.longest || Math.abs(Number(number.split(/e/i)[1] ?? 0)) > aids.most_exponent;

  /** The values of a quantity in the first unit of its dimension; two for a ramp or a band. */
  function valuesOf(control, text) {
    const units = control.measures.flatMap((dimension) => [...spellings.get(dimension).keys()]);
    const unit = units.sort((a, b) => b.length - a.length).map(escaped).join("|");
    const start = `(?:(${NUMBER}) ?(${unit})?(?: to | ?- ?))?`;
    const found = new RegExp(`^[<>≤≥]? ?${start}(${NUMBER}) ?(${unit})$`, "i").exec(text);
    if (!found) return [];
    const [, low, lowUnit = found[4], high, highUnit] = found;
    const value = (number, spelling) => {
      const { factor, offset } = unitOf(control, spelling) ?? { factor: 1, offset: 0 };
      return { number, value: Number(number) * factor + offset };
    };
    return [...(low === undefined ? [] : [value(low, lowUnit)]), value(high, highUnit)];
  }

  function outOfBounds(control, text) {
    const { above, least, most } = control.bounds;
    const unit = aids.units[control.measures[0]][0].symbol;
    for (const { number, value } of valuesOf(control, text)) {
      if (isBeyondMeasure(number)) return { says: "This number is beyond any measurement." };
      const isTooLow = value <= above || value < least;
      if (isTooLow) return { says: `This is impossible: write more than ${above ?? least} ${unit}.` };
      if (value > most * (1 + 1e-12)) return { says: `This is impossible: write at most ${most} ${unit}.` };
    }
    return null;
  }

  function quantityProblem(control, typed) {
    const text = tidy(typed), word = text.toLowerCase();
    if (new RegExp(control.pattern).test(text)) return outOfBounds(control, text);
    if (Object.hasOwn(aids.vague, word)) return { says: `“${text}” was not measured: write ${aids.vague[word]}.` };
    const about = text.replace(/^(~|≈|ca\.?|circa|about|approx\.?) */i, "");
    if (about !== text) return { says: `Leave out “about”: write ${about}.`, fixes: [about] };
    if (/\d,\d/.test(text)) {
      const fixes = [text.replace(",", "."), ...(/\d,\d{3}(?!\d)/.test(text) ? [text.replace(",", "")] : [])];
      return { says: `There is a comma inside the number: write ${listed(fixes)}.`, fixes };
    }
    const [, number, spelling] = new RegExp(`^(${NUMBER}) ?(.*)$`).exec(text) ?? [];
    if (number === undefined) return { says: `Write a number and a unit, such as ${control.example}.` };
    if (!spelling) {
      const units = symbols(control);
      const fixes = units.slice(0, 2).map((unit) => `${number} ${unit}`);
      const shifted = aids.units[control.measures[0]].find((unit) => unit.offset);
      // In kelvin the same temperature is another number.
      if (shifted) fixes[1] = `${Math.round(Number(number) - shifted.offset)} ${shifted.symbol}`;
      const more = units.length > 2 ? `; units: ${units.join(", ")}` : "";
      return { says: `The unit is missing: write ${listed(fixes)}${more}.`, fixes };
    }
    return unitProblem(control, text, number, spelling);
  }

  function unitProblem(control, text, number, spelling) {
    const permitted = symbols(control);
    if (unitOf(control, spelling)) return { says: `Write a number above zero, such as ${control.example}.` };
    const other = [...spellings].find(([, known]) => known.has(spelling))?.[0];
    if (other) return { says: `${spelling} is a unit of ${other}: use ${listed(permitted)}.` };
    const word = spelling.toLowerCase();
    const folded = permitted.find((unit) => unit.toLowerCase() === word);
    const likely = folded ?? (Object.hasOwn(aids.spelled_out, word) ? aids.spelled_out[word] : undefined);
    if (permitted.includes(likely)) {
      const fix = `${number} ${likely}`;
      return { says: `The unit “${spelling}” is unknown: write ${fix}.`, fixes: [fix] };
    }
    if (/\d/.test(spelling)) return { says: `Write one number and one unit, such as ${control.example}.` };
    return { says: `The unit “${spelling}” is unknown: use ${listed(permitted)}.` };
  }

  // --- other texts ------------------------------------------------------------------------------------------------

  function casProblem(text) {
    const digits = [...text.replaceAll("-", "")].reverse().map(Number);
    const sum = digits.reduce((total, digit, place) => total + place * digit, 0);
    return sum % 10 === digits[0] ? null : { says: "The check digit of this CAS number is wrong." };
  }

  function dateProblem(text) {
    const day = new Date(`${text}T00:00:00Z`);
    const isDay = !Number.isNaN(day.valueOf()) && day.toISOString().startsWith(text);
    return isDay ? null : { says: `${text} is no day of the calendar.` };
  }

  function dateMend(text) {
    const [, day, month, year] = /^(\d{1,2})\.(\d{1,2})\.(\d{4})$/.exec(text) ?? [];
    const fix = year && `${year}-${month.padStart(2, "0")}-${day.padStart(2, "0")}`;
    return fix ? { says: `Write ${fix}.`, fixes: [fix] } : { says: "Write year, month and day, such as 2026-03-14." };
  }

  function entryProblem(text) {
    const isRight = checkCharacter(text.slice(0, -1)) === text.at(-1);
    return isRight ? null : { says: "The last character does not fit: look for a slip." };
  }

  function smilesProblem(text) {
    const { fault, charge } = globalThis.handbookChemistry;
    const wrong = fault(text), net = wrong ? 0 : charge(text);
    if (wrong) return { says: `This is not a SMILES: ${wrong}.`, isDoubt: true };
    const sign = net < 0 ? "\u2212" : "+";
    const says = `This is an ion without its counter-ion, charge ${sign}${Math.abs(net)}: write both, such as [Na+].[OH-].`;
    return net ? { says, isDoubt: true } : null;
  }

  function ratioProblem(text, { labels }) {
    const [parts, numbers] = text.includes(" = ") ? text.split(" = ") : [null, text];
    if (numbers.split(":").some(isBeyondMeasure)) return { says: "A number here is beyond any measurement." };
    if (parts === null) return null;
    if (parts.split(":").length !== numbers.split(":").length) return { says: "Give each part one number." };
    const named = parts.split(/[:+]/);
    const twice = named.find((label, place) => named.indexOf(label) < place);
    if (twice) return { says: `${twice} stands twice.` };
    const unknown = labels && named.find((label) => !labels.has(label));
    return unknown ? { says: `No product has the label ${unknown}.` } : null;
  }

  function ratioMend(control, text) {
    const fix = text.replace(/\s*=\s*/g, " = ").replace(/\s*[:/]\s*/g, ":");
    if (fix !== text && new RegExp(control.pattern).test(fix)) return { says: `Write ${fix}.`, fixes: [fix] };
    return { says: `Write it like ${control.example}.` };
  }

  const FORMS = {
    cas: (text) => casProblem(text),
    date: (text) => dateProblem(text),
    entry: (text) => entryProblem(text),
    ratio: ratioProblem,
    smiles: smilesProblem,
    inchi: (text) => (/^InChI=1S?\/\S+$/.test(text) ? null : { says: "An InChI begins with InChI=1S/." }),
    person: (text) => {
      const isKnown = !format.people.length || format.people.includes(text);
      const says = `The book knows ${listed(format.people)}; ask its editor to add ${text}.`;
      return isKnown ? null : { says, isDoubt: true };
    },
    label: (text, { labels, words }) =>
      (!labels || labels.has(text) || words?.includes(text) ? null : { says: `No product has the label ${text}.` }),
  };
  const MENDS = { date: (control, text) => dateMend(text), ratio: ratioMend };
  const MARKUP = new RegExp(aids.markup, "i");
  const UNPRINTABLE = /[^\t\n\x20-\x7e\xa0-\u2027\u202a-\ud7ff\ue000-\ufefe\uff00-\ufffd\u{10000}-\u{10ffff}]/u;

  function textProblem(control, text, context) {
    if (UNPRINTABLE.test(text)) return { says: "There is a character that cannot be printed: delete it." };
    if (text.length > control.maxLength) return { says: `This is too long: at most ${control.maxLength} characters.` };
    const markup = MARKUP.exec(text)?.[0];
    if (markup) return { says: `${markup} looks like HTML: write plain text.` };
    if (control.pattern && !new RegExp(control.pattern).test(text)) {
      const mend = MENDS[control.format];
      if (mend) return mend(control, text);
      const likely = control.example ? `Write it like ${control.example}.` : "This does not have the shape that is wanted.";
      return { says: likely };
    }
    return FORMS[control.format]?.(text, context) ?? null;
  }

  function numberProblem(control, text) {
    const isWhole = control.is === "integer";
    const [, number] = /^(-?(?:\d+(?:[.,]\d+)?|[.,]\d+))\s*(?:equiv\.?|eq\.?|equivalents?)?$/i.exec(text) ?? [];
    const plain = number?.replace(",", ".").replace(/^(-?)\./, "$10.").replace(/^(-?)0+(?=\d)/, "$1");
    if (plain === undefined || (isWhole && /\D/.test(plain))) {
      return { says: isWhole ? "Write a whole number." : `Write a bare number, such as ${control.example || "1.5"}.` };
    }
    if (plain !== text) return { says: `Write ${plain}.`, fixes: [plain] };
    const { least, above, most } = control;
    if (Number(plain) < least || Number(plain) <= above) return { says: "Write a larger number." };
    const isTooLarge = Number(plain) > most || plain.length > aids.longest;
    return isTooLarge ? { says: `Write at most ${most ?? "what was measured"}.` } : null;
  }

  /**
   * What is wrong with a text as typed, with texts to put in its place where there are; null for nothing.
   * isDoubt: the writer may know better, about a structure drawn in an uncommon way or a person the book does not list.
   */
  function problem(control, typed, context = {}) {
    const text = typed.trim();
    if (!text) return null;
    if (control.measures) return quantityProblem(control, text);
    return control.is === "text" ? textProblem(control, text, context) : numberProblem(control, text);
  }

  // --- conditions of the schema -----------------------------------------------------------------------------------

  const typeOf = (value) => (Array.isArray(value) ? "array" : typeof value);

  /** What a plain value lacks of a condition: the keys at stake and how they are; null where it holds. */
  function lacking(node, value) {
    const keys = (node.required ?? []).filter((key) => value?.[key] === undefined);
    if (keys.length) return { keys, how: "all" };
    if ("const" in node && value !== node.const) return { keys: [], how: "all" };
    if (node.enum && !node.enum.includes(value)) return { keys: [], how: "all" };
    if (node.type && typeOf(value) !== node.type) return { keys: [], how: "all" };
    if (node.minItems > value?.length) return { keys: [], how: "all" };
    if (node.contains && !value.some((item) => !lacking(node.contains, item))) return { keys: [], how: "all" };
    for (const [key, below] of Object.entries(node.properties ?? {})) {
      if (value?.[key] !== undefined && lacking(below, value[key])) return { keys: [key], how: "all" };
    }
    if (node.not && !lacking(node.not, value)) return { keys: node.not.required ?? [], how: "not" };
    for (const each of node.allOf ?? []) {
      const lack = lacking(each, value);
      if (lack) return lack;
    }
    for (const [many, how] of [[node.anyOf, "any"], [node.oneOf, "one"]]) {
      const lacks = many?.map((each) => lacking(each, value)) ?? [];
      const holds = lacks.filter((lack) => !lack).length;
      const isMet = how === "any" ? holds > 0 : holds === 1;
      if (many && !isMet) return { keys: lacks.flatMap((lack) => lack?.keys ?? []), how };
    }
    const branch = node.if && (lacking(node.if, value) ? node.else : node.then);
    return branch ? lacking(branch, value) : null;
  }

  // --- YAML -------------------------------------------------------------------------------------------------------

  const quoted = (text) => `'${text.replaceAll("'", "''")}'`;
  const RESERVED = /^(?:true|false|yes|no|on|off|null|y|n)$/i;
  const PLAIN = /^[\p{L}\p{N}(][\p{L}\p{N} ()+,./%'\u2019\u2013=°<>-]*$/u;

  /** Whether both YAML 1.1 and 1.2 read this as the text it is, without quotes, in block style. */
  function isPlain(text) {
    const isNumber = !/\p{L}/u.test(text) || /^[\d._,+e-]*$/i.test(text) || /^0[xob]/i.test(text);
    return PLAIN.test(text) && !RESERVED.test(text) && !isNumber;
  }

  function scalar({ text, style }, margin) {
    if (style === "plain") return text;
    if (style === "quantity") return /^[-+<≤≥.\d]/.test(text) ? text : quoted(text);
    if (style === "quoted") return quoted(text);
    if (text.includes("\n")) return ["|-", ...text.split("\n").map((line) => (line ? margin + line : line))].join("\n");
    return isPlain(text) ? text : quoted(text);
  }

  /** A list on one line, where nothing in it holds a comma or a sign that means something there; else null. */
  function onOneLine(list) {
    const texts = list.items.map((item) => (item.items ? onOneLine(item) : scalar(item, "")));
    const isFit = (text, item) => text !== null && (item.items || /^[\p{L}\p{N}-][\p{L}\p{N} ._%+-]*$/u.test(text));
    const line = `[${texts.join(", ")}]`;
    return texts.every((text, at) => isFit(text, list.items[at])) && (line.length <= 90 || list.isData) ? line : null;
  }

  function* linesOf({ keys }, margin) {
    for (const [key, value] of keys) {
      const line = value.items && (value.isData || !value.items.some((item) => item.keys)) ? onOneLine(value) : null;
      if (line !== null) yield `${margin}${key}: ${line}`;
      else if (value.keys) {
        yield `${margin}${key}:`;
        yield* linesOf(value, `${margin}  `);
      } else if (value.items) {
        yield `${margin}${key}:`;
        for (const item of value.items) yield* itemLines(item, `${margin}  `);
      } else yield `${margin}${key}: ${scalar(value, `${margin}  `)}`;
    }
  }

  function* itemLines(item, margin) {
    if (!item.keys) {
      yield `${margin}- ${scalar(item, `${margin}  `)}`;
      return;
    }
    const [first, ...rest] = linesOf(item, `${margin}  `);
    yield `${margin}- ${first.slice(margin.length + 2)}`;
    yield* rest;
  }

  /**
   * The file of a record: {keys: [[key, value]]} for a mapping, {items} for a list, {text, style} for a text.
   * style: plain as it stands, quantity, quoted always, or text, quoted where YAML would read it otherwise.
   */
  const yaml = (record) => `${[format.modeline, ...linesOf(record, "")].join("\n")}\n`;

  return { mint, problem, lacking, yaml, tidy };
};
