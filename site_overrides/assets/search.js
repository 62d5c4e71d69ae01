// What a query finds in the data that builder/publish/search_index.py wrote: handbookFinder(data).find(query, most).
// No DOM in here, so that the box, other pages and tests ask the same functions; chemistry.js comes before it.
//
// A query is read as a key (identifier, CAS number, InChIKey, SMILES), as a name or formula of a compound, as a word
// that entries are filed under, as part of a name, and at last as words of the text. The more exact reading is listed
// first; among equals, entries that still hold, then what an entry is about before what it uses, then the newest.
"use strict";
globalThis.handbookFinder = (() => {
  const ENTRY = 9, KEY = 8, NAME = 7, LOOSE = 6, FILED = 5, START = 4, INSIDE = 3, TITLE = 2, TEXT = 1;
  const KEYS = ["formulas", "cas", "inchikey", "smiles", "variants"];
  /** Words of a query that are looked at; whoever pastes a page shall not wait for it. */
  const MOST_WORDS = 10;
  /** Weight of a query that was found as it stands; more than its words can weigh apart. */
  const WHOLE = 1000;
  const { hill, outline } = handbookChemistry;

  // --- spellings ------------------------------------------------------------------------------------------------

  const GREEK = Object.fromEntries((
    "α alpha β beta γ gamma δ delta ε epsilon ζ zeta η eta θ theta ι iota κ kappa λ lambda μ mu ν nu ξ xi ο omicron " +
    "π pi ρ rho ς sigma σ sigma τ tau υ upsilon φ phi χ chi ψ psi ω omega"
  ).match(/\S+ \S+/g).map((pair) => pair.split(" ")));
  const POSITIONS = { o: 2, m: 3, p: 4 };
  const SAME = [
    [/sulph/g, "sulf"], [/\bcesium/g, "caesium"], [/aluminum/g, "aluminium"],
    [/(?<![a-z])t(?:ert)?[-. ]?(?=bu)/g, "tert-"],
    [/trifluoromethane ?sulfonate/g, "triflate"], [/methane ?sulfonate/g, "mesylate"],
    [/(?:4-)?(?:toluene|methylbenzene)(?:-1-| )?sulfonate/g, "tosylate"],
  ];
  const STEREO = new RegExp(
    "\\((?:[-+±]|\\d*[a-z]?[rsez]\\*?(?:, ?\\d*[a-z]?[rsez]\\*?)*)\\)[- ]?" +
    "|(?<![a-z])(?:rac|meso|cis|trans|dl|[rsezdl])-(?=[a-z\\d(])", "g");
  const LETTERS = "a-z\\u00c0-\\u024f\\u0370-\\u1fff\\u3040-\\ud7ff";
  const WORD = new RegExp(`[${LETTERS}\\d]+`, "g");
  const OF_WORD = new RegExp(`[${LETTERS}\\d]`);
  const NO_LETTER = new RegExp(`[^${LETTERS}\\t\\n]+`, "g");
  const FILLERS = new Set("a and at by for from in of on the to with".split(" "));

  /** One form of each sign: dashes, primes, digits above and below the line; accents go. */
  const signs = (text) => text.normalize("NFKD")
    .replace(/[\u0300-\u036f]/g, "").replace(/[‐-―−⁃]/g, "-").replace(/[‘’‛′‵ʹʼ´]/g, "'");

  /** One spelling of words: small letters, Greek ones by name, 4- for p-, one of two names in use. */
  function fold(text) {
    const small = signs(text)
      .replace(/[Α-ω]/g, (letter) => GREEK[letter.toLowerCase()] ?? letter)
      .replace(/(?<![A-Za-z])n-(?=[a-z])/g, "")
      .replace(/(?<![A-Za-z])([omp])-(?=[a-z])/g, (_, letter) => `${POSITIONS[letter]}-`)
      .toLowerCase();
    return SAME.reduce((folded, [pattern, instead]) => folded.replace(pattern, instead), small);
  }

  const wordsOf = (folded) => folded.match(WORD) ?? [];
  const solid = (folded) => wordsOf(folded).join("");
  const flat = (folded) => folded.replace(STEREO, "");

  /** Folded names -> their letters alone, stereodescriptors left out. */
  const bare = (folded) => flat(folded).replace(NO_LETTER, "");

  /** Folded name -> its key: where a locant stands does not count, so that 2-butanol is butan-2-ol. */
  function key(folded) {
    const isLocant = (word) => /^\d+$/.test(word);
    const words = wordsOf(folded);
    return [words.filter((word) => !isLocant(word)).join(""), ...words.filter(isLocant)].join(",");
  }

  /** How many letters to change, add, drop or swap to get from one word to another; more than `most` is not counted. */
  function distance(one, other, most) {
    if (Math.abs(one.length - other.length) > most) return most + 1;
    let before = [], row = Array.from({ length: other.length + 1 }, (_, j) => j);
    for (let i = 1; i <= one.length; i++) {
      const next = [i];
      for (let j = 1; j <= other.length; j++) {
        const steps = Math.min(row[j] + 1, next[j - 1] + 1, row[j - 1] + (one[i - 1] === other[j - 1] ? 0 : 1));
        const isSwap = one[i - 1] === other[j - 2] && one[i - 2] === other[j - 1];
        next.push(isSwap ? Math.min(steps, before[j - 2] + 1) : steps);
      }
      if (Math.min(...next) > most) return most + 1;
      [before, row] = [row, next];
    }
    return row[other.length];
  }

  // --- columns ----------------------------------------------------------------------------------------------------

  /** Lines of text in one string, which a browser searches much faster than many. */
  class Lines {
    constructor(text) {
      this.text = text;
      this.ends = [];
      for (let at = text.indexOf("\n"); at >= 0; at = text.indexOf("\n", at + 1)) this.ends.push(at);
      this.ends.push(text.length);
    }

    /** Call `visit` with the number of each line that holds `needle`, and whether a word begins with it there. */
    each(needle, visit) {
      const { text, ends } = this;
      let line = 0;
      for (let at = text.indexOf(needle); at >= 0;) {
        const opens = at === 0 || !OF_WORD.test(text[at - 1]);
        while (ends[line] <= at) line++;
        visit(line, opens);
        at = text.indexOf(needle, opens ? ends[line] : at + 1);
      }
    }
  }

  const typed = (column) => new Lines(column.map((cell) => ` ${cell} `).join("\n"));
  const said = (column) => new Lines(fold(column.join("\n")));

  /** Names, several to a cell and parted by tabs: folded, and their letters alone for exact look-up. */
  function spelled(column, how) {
    const folded = fold(`\t${column.join("\t\n\t")}\t`);
    const letters = bare(folded);
    return { how, column, folded: new Lines(folded), bare: new Lines(letters), known: new Set(letters.split("\t")) };
  }

  /** Lists, one for each entry -> by value, the entries it occurs in; what comes with it stands after each entry. */
  function occurrences(lists, count, step) {
    const found = Array.from({ length: count }, () => []);
    lists.forEach((items, entry) => {
      for (let i = 0; i < items.length; i += step) found[items[i]].push(entry, ...items.slice(i + 1, i + step));
    });
    return found;
  }

  /** The place of each entry and page among equals, the largest first: the newest, then the order of the book. */
  function ranks(dates, count) {
    const order = Array.from({ length: count }, (_, doc) => doc);
    const date = (doc) => dates[doc] ?? "";
    order.sort((one, other) => (date(one) < date(other) ? 1 : date(one) > date(other) ? -1 : one - other));
    const rank = new Uint32Array(count);
    order.forEach((doc, place) => { rank[doc] = count - place; });
    return rank;
  }

  return function handbookFinder(data) {
    const { entries, compounds, pages, roles, facets } = data;
    const count = entries.id.length;
    const names = [spelled(compounds.names, ""), spelled(compounds.synonyms, "synonym")];
    const keys = Object.fromEntries(KEYS.map((field) => [field, typed(compounds[field])]));
    const takenPart = occurrences(entries.participants, compounds.names.length, 2);
    const filed = occurrences(entries.facets, facets.length, 1);
    const notebooks = fold(entries.notebook.join("\n")).split("\n").map(solid);
    const facetWords = facets.map(([, value]) => fold(value));
    const facetLines = new Lines(facetWords.join("\n"));
    const texts = [
      [TITLE, "title", said([...entries.title, ...pages.title])],
      [TEXT, "take-away", said([...entries.take_away, ...pages.text])],
      [TEXT, "conditions", said(entries.conditions)],
      [TEXT, "outcome", said(entries.outcome)],
    ];
    const rank = ranks(entries.date, count + pages.path.length);
    const holds = entries.status.map((status) => !data.retired.includes(data.statuses[status]));
    let vocabulary = null;

    // --- readings of a query --------------------------------------------------------------------------------------

    /** The entries or the page that the query means by a key of their own. */
    function meant(text) {
      const upper = signs(text).toUpperCase();
      const id = /NS[0-9A-Z]{7}(?![0-9A-Z])/.exec(upper)?.[0] ?? upper.replace(/[\s-]/g, "");
      const entry = entries.id.indexOf(`NS${id.slice(2).replace(/[IL]/g, "1").replace(/O/g, "0")}`);
      if (id.startsWith("NS") && entry >= 0) return new Map([[entry, { tier: ENTRY, weight: 0, why: "identifier" }]]);
      const page = pages.key.indexOf(text.toLowerCase());
      if (page >= 0) return new Map([[count + page, { tier: ENTRY, weight: 0, why: "" }]]);
      const reference = solid(fold(text)), found = new Map();
      if (/^NS[0-9A-Z]{2,6}$/.test(upper)) {
        entries.id.forEach((each, place) => {
          if (each.startsWith(upper)) found.set(place, { tier: ENTRY, weight: 0, why: "identifier, so far" });
        });
      }
      notebooks.forEach((each, place) => {
        if (each && each === reference) found.set(place, { tier: ENTRY, weight: 0, why: "notebook reference" });
      });
      return found;
    }

    /** Compounds that the text names: by compound, the best reading and what it went by. */
    function named(text) {
      const found = new Map();
      const add = (compound, tier, how) => {
        if (!(found.get(compound)?.tier >= tier)) found.set(compound, { tier, how });
      };
      const scan = (field, needle, tier, how) => keys[field].each(needle, (compound) => add(compound, tier, how));
      const plain = signs(text), folded = fold(text), letters = bare(folded);
      const cas = /^(?:cas\D*)?(\d{2,7}-\d\d-\d)$/i.exec(plain);
      const inchikey = /^(?:inchikey=)?(([A-Z]{14})(?:-[A-Z]{10}-[A-Z])?)$/i.exec(plain.toUpperCase());
      if (cas) scan("cas", ` ${cas[1]} `, KEY, "CAS number");
      if (inchikey) {
        scan("inchikey", ` ${inchikey[1]}`, KEY, "InChIKey");
        scan("inchikey", ` ${inchikey[2]}-`, LOOSE, "InChIKey, stereo left aside");
      }
      if (!/\s/.test(text)) {
        scan("smiles", ` ${text} `, KEY, "SMILES");
        scan("variants", ` ${text} `, NAME, "SMILES, stereo or other ions left aside");
        for (const formula of new Set([hill(plain), hill(plain.replace(/(\d)([+-])$/, "^$1$2"))])) {
          if (formula) scan("formulas", ` ${formula} `, NAME, "formula");
        }
        const drawn = text.length > 2 && outline(text);
        if (drawn) {
          keys.formulas.each(` ${drawn.formula} `, (compound) => {
            const [smiles] = compounds.smiles[compound].split(" ");
            if (smiles && outline(smiles)?.outline === drawn.outline) add(compound, NAME, "SMILES drawn otherwise");
          });
        }
      }
      const exact = key(folded), joined = solid(folded), loose = key(flat(folded));
      for (const { how, column, bare: lines, known } of letters ? names : []) {
        if (known.has(letters)) lines.each(`\t${letters}\t`, (compound) => {
          for (const name of fold(column[compound]).split("\t")) {
            if (key(name) === exact || solid(name) === joined) add(compound, NAME, how);
            else if (key(flat(name)) === loose) add(compound, LOOSE, "stereo left aside");
          }
        });
      }
      return found;
    }

    /** Facets whose word, or abbreviation, the text is. */
    const facetsNamed = (text) => {
      const folded = fold(text);
      return facets.flatMap(([, , short], facet) => (facetWords[facet] === folded || (short && short === text) ? [facet] : []));
    };

    /** Entries and pages by every reading of the text as one thing; only those that are `within`, where that is given. */
    function unit(text, within) {
      const found = new Map();
      const isBest = (doc, tier, weight) => {
        if (within && !within.has(doc)) return false;
        const known = found.get(doc);
        return !known || known.tier < tier || (known.tier === tier && known.weight < weight);
      };
      const takesPart = (compound, tier, how, bonus = 0) => {
        const list = takenPart[compound];
        for (let i = 0; i < list.length; i += 2) {
          const [entry, role] = [list[i], list[i + 1]], weight = roles[role][1] + bonus;
          if (isBest(entry, tier, weight)) found.set(entry, { tier, weight, why: { role, how, compound } });
        }
      };
      const holdsWord = (docs, tier, why) => {
        for (const doc of docs) if (isBest(doc, tier, 0)) found.set(doc, { tier, weight: 0, why });
      };
      for (const [compound, { tier, how }] of named(text)) takesPart(compound, tier, how);
      for (const facet of facetsNamed(text)) holdsWord(filed[facet], FILED, { facet });
      const folded = fold(text);
      if (folded.length < 2) return found;
      for (const { how, folded: lines } of names) {
        const part = how ? "part of a synonym" : "part of the name";
        lines.each(folded, (compound, opens) => {
          if (opens) takesPart(compound, START, part, how ? 0 : 0.5);
          else if (folded.length > 2) takesPart(compound, INSIDE, part);
        });
      }
      facetLines.each(folded, (facet, opens) => { if (opens) holdsWord(filed[facet], INSIDE, { facet }); });
      for (const [tier, where, lines] of texts) {
        const why = { where };
        lines.each(folded, (doc, opens) => { if (opens) holdsWord([doc], tier, why); });
      }
      return found;
    }

    /** Words -> the longest stretches of them that name something; other words stand alone. */
    function stretches(words) {
      const cut = [];
      for (let from = 0, to; from < words.length; from = to) {
        const stretch = () => words.slice(from, to).join(" ");
        for (to = Math.min(words.length, from + 4); to > from + 1; to--) {
          if (named(stretch()).size || facetsNamed(stretch()).length) break;
        }
        cut.push(stretch());
      }
      return cut;
    }

    /** Entries and pages that have every one of several readings. */
    function together(cut) {
      const readings = [];
      for (const stretch of cut) readings.push(unit(stretch, readings.at(-1)));
      const found = new Map();
      for (const doc of readings.at(-1).keys()) {
        const hits = readings.map((reading) => reading.get(doc));
        found.set(doc, {
          tier: Math.min(...hits.map((hit) => hit.tier)),
          weight: hits.reduce((sum, hit) => sum + 10 * hit.tier + hit.weight, 0),
          why: hits.map((hit) => hit.why),
        });
      }
      return found;
    }

    function lookUp(text) {
      const found = meant(text);
      if (found.size) return found;
      const whole = unit(text);
      const words = text.split(/\s+|\/(?=\p{L})/u).map((word) => word.replace(/[,;]$/, ""));
      const telling = words.filter((word) => !FILLERS.has(word.toLowerCase()) && /[\p{L}\d]/u.test(word));
      for (const hit of whole.values()) hit.weight += WHOLE;
      const cut = words.length > 1 ? stretches(telling.slice(0, MOST_WORDS)) : [];
      if (cut.length > 1 || (cut.length && cut[0] !== text)) {
        for (const [doc, hit] of together(cut)) if (!(whole.get(doc)?.tier >= hit.tier)) whole.set(doc, hit);
      }
      return whole;
    }

    /** The query with each word that leads nowhere put right; "" where no known word is near. */
    function mended(text) {
      vocabulary ??= [...new Set([...names.map((each) => each.folded.text), facetLines.text].flatMap(wordsOf))]
        .filter((word) => word.length > 3);
      const everything = [...names.map((each) => each.folded), facetLines, ...texts.map(([, , lines]) => lines)];
      const words = wordsOf(fold(text));
      if (words.length > MOST_WORDS) return "";
      const better = words.map((word) => {
        if (word.length < 4 || everything.some((lines) => lines.text.includes(word))) return word;
        if (/[a-z]\d|\d[a-z]/.test(word)) return ""; // a formula or a key: near is another one
        let least = word.length < 8 ? 1 : 2, nearest = "";
        for (const other of vocabulary) {
          const steps = distance(word, other, least);
          if (steps < least || (steps === least && !nearest)) [least, nearest] = [steps, other];
        }
        return nearest;
      });
      return better.every(Boolean) && better.join() !== words.join() ? better.join(" ") : "";
    }

    // --- hits in words ----------------------------------------------------------------------------------------------

    function inWords(why) {
      if (Array.isArray(why)) return [...new Set(why.map(inWords))].join("; ");
      if (why.where) return `mentioned in the ${why.where}`;
      if (why.facet !== undefined) return facets[why.facet].slice(0, 2).join(": ");
      if (why.role === undefined) return why;
      const name = compounds.names[why.compound].split("\t", 1)[0];
      return `${roles[why.role][0]}${why.how && `, ${why.how}`}: ${name}`;
    }

    function shown(doc, { why }) {
      const page = doc - count;
      if (page >= 0) return { title: pages.title[page], path: pages.path[page], why: pages.text[page], id: "", outcome: "", verdict: "", status: "" };
      const id = entries.id[doc];
      const [verdict, status] = [data.verdicts[entries.verdict[doc]], data.statuses[entries.status[doc]]];
      return { title: entries.title[doc], path: `e/${id}/`, why: inWords(why), id, outcome: entries.outcome[doc], verdict, status };
    }

    /** One number that is larger for what comes first; pages come after the entries of their tier. */
    const merit = (doc, { tier, weight }) =>
      (((tier * 2 + (doc < count)) * 2 + (holds[doc] ?? true)) * 4096 + 2 * weight) * 2 ** 20 + rank[doc];

    /** The `most` that come first; sorting all of a thousand would take longer than finding them. */
    function best(found, most) {
      const merits = Float64Array.from(found, ([doc, hit]) => merit(doc, hit)).sort();
      const least = merits[Math.max(0, merits.length - most)];
      return [...found].filter(([doc, hit]) => merit(doc, hit) >= least).sort((one, other) => merit(...other) - merit(...one));
    }

    return {
      /** Look in longer texts too, one for each entry; they come later, because the rest answers without them. */
      addNotes(notes) { texts.push([TEXT, "notes", said(notes)]); },

      /** Return how much a query finds, the first `most` of it, and what was looked up instead where it had a slip. */
      find(query, most) {
        const text = query.trim();
        let found = text ? lookUp(text) : new Map(), instead = "";
        if (text && !found.size) {
          instead = mended(text);
          if (instead) found = lookUp(instead);
        }
        return { total: found.size, instead, hits: best(found, most).map(([doc, hit]) => shown(doc, hit)) };
      },
    };
  };
})();
