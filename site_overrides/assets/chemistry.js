// Formulae and SMILES as a search needs them: read, and brought into an order that does not depend on who wrote them.
// No toolkit: the smallest has a hundred times the size of this, and the search box asks nothing more of one.
"use strict";
globalThis.handbookChemistry = (() => {
  /** Hill order: carbon, hydrogen, then the alphabet; without carbon all by the alphabet. Charge last, "CO3-2". */
  function inHillOrder(counts, charge) {
    const first = counts.C ? ["C", "H"].filter((element) => counts[element]) : [];
    const order = [...first, ...Object.keys(counts).filter((element) => !first.includes(element)).sort()];
    const atoms = order.map((element) => element + (counts[element] > 1 ? counts[element] : "")).join("");
    const size = Math.abs(charge);
    return atoms + (size ? (charge > 0 ? "+" : "-") + (size > 1 ? size : "") : "");
  }

  /** A formula as typed, its elements in any order and with brackets, -> in Hill order; "" for what is none. */
  function hill(text) {
    const typed = /^((?:[A-Z][a-z]?\d*|\(|\)\d*)+)(?:\^?(\d?)([+-]))?$/.exec(text);
    const open = [{}];
    for (const [, element, count, bracket, times] of (typed?.[1] ?? "").matchAll(/([A-Z][a-z]?)(\d*)|([()])(\d*)/g)) {
      if (bracket === "(") open.push({});
      else if (bracket && open.length < 2) return "";
      else {
        const inner = bracket ? open.pop() : { [element]: 1 };
        const outer = open.at(-1);
        for (const each in inner) outer[each] = (outer[each] ?? 0) + inner[each] * ((bracket ? times : count) || 1);
      }
    }
    const charge = typed?.[3] ? Number(`${typed[3]}${typed[2] || 1}`) : 0;
    return typed && open.length === 1 ? inHillOrder(open[0], charge) : "";
  }

  // --- SMILES -----------------------------------------------------------------------------------------------------

  const TOKEN = /\[(\d*)(se|as|te|[A-Z][a-z]?|[a-z])@*(?:H(\d?))?([+-]\d|[+-]*)(?::\d+)?\]|(Br|Cl|[BCNOPSFI]|[bcnops])|([-=#$:/\\.])|([()])|%(\d\d)|(\d)/y;
  const ORDERS = { "=": 2, "#": 3, $: 4 };
  const VALENCES = { B: [3], C: [4], N: [3, 5], O: [2], P: [3, 5], S: [2, 4, 6], F: [1], Cl: [1], Br: [1], I: [1] };

  /** The atoms of a SMILES with what is bonded to them; null for what is none. */
  function atomsOf(smiles) {
    const atoms = [], branches = [], rings = new Map();
    let last = null, order = 1;
    const bond = (atom) => {
      for (const [one, other] of last ? [[last, atom], [atom, last]] : []) {
        one.bonds += order;
        one.near.push(other);
      }
      order = 1;
    };
    for (TOKEN.lastIndex = 0; TOKEN.lastIndex < smiles.length;) {
      const [, isotope = "", boxed, hydrogens, sign, plain, link, branch, ...ring] = TOKEN.exec(smiles) ?? [];
      const symbol = boxed ?? plain, label = ring.find(Boolean);
      if (symbol) {
        const element = symbol[0].toUpperCase() + symbol.slice(1);
        const charge = /\d/.test(sign) ? Number(sign) : (sign ?? "").length * (sign?.[0] === "-" ? -1 : 1);
        const known = boxed && (hydrogens === undefined ? 0 : Number(hydrogens || 1));
        const atom = { element, isotope, charge, known, isFlat: element !== symbol, bonds: 0, near: [] };
        bond(atom);
        last = atom;
        atoms.push(atom);
      } else if (link) {
        order = ORDERS[link] ?? 1;
        if (link === ".") last = null;
      } else if (branch === "(") branches.push(last);
      else if (branch && branches.length) last = branches.pop();
      else if (label && rings.has(label)) {
        const [start, typed] = rings.get(label);
        rings.delete(label);
        order = Math.max(order, typed);
        bond(start);
      } else if (label) {
        rings.set(label, [last, order]);
        order = 1;
      } else return null;
    }
    return branches.length || rings.size ? null : atoms;
  }

  function hydrogensOn({ element, known, isFlat, bonds, near }) {
    if (known !== undefined) return known;
    if (isFlat) return element === "C" ? Math.max(0, 3 - near.length) : 0;
    return (VALENCES[element].find((valence) => valence >= bonds) ?? bonds) - bonds;
  }

  const hashed = (text) => [...text].reduce((hash, letter) => (Math.imul(hash, 33) ^ letter.charCodeAt(0)) >>> 0, 5381);

  /**
   * What stays the same however a SMILES is written: its formula, and an outline made of each atom's surroundings.
   * Bond orders and charges enter through the hydrogens and the formula alone, so that Kekulé rings and both forms of
   * a nitro or azido group are one; stereochemistry is left aside. Returns null for what is no SMILES.
   */
  function outline(smiles) {
    const atoms = atomsOf(smiles);
    if (!atoms?.length) return null;
    const counts = {};
    for (const atom of atoms) {
      const hydrogens = hydrogensOn(atom);
      counts[atom.element] = (counts[atom.element] ?? 0) + 1;
      if (hydrogens) counts.H = (counts.H ?? 0) + hydrogens;
      atom.mark = `${atom.isotope}${atom.element}${hydrogens}`;
    }
    for (let round = 0; round < Math.min(atoms.length, 12); round++) {
      const marks = atoms.map(({ mark, near }) => hashed([mark, ...near.map((other) => other.mark).sort()].join()));
      atoms.forEach((atom, i) => { atom.mark = String(marks[i]); });
    }
    return { formula: inHillOrder(counts, charge(smiles)), outline: atoms.map((atom) => atom.mark).sort().join() };
  }

  const NAMES = { B: "boron", C: "carbon", N: "nitrogen", O: "oxygen", P: "phosphorus", S: "sulfur" };

  /** What a SMILES as typed has wrong with it, in a chemist's words; "" for nothing that can be told without a toolkit. */
  function fault(smiles) {
    if (/\s/.test(smiles)) return "there is a space in it";
    const outside = smiles.replace(/\[[^[\]]*\]/g, "*");
    if (/[[\]]/.test(outside)) return "a bracket [ ] has only one end";
    const [odd] = outside.replace(/Br|Cl|[BCNOPSFI]|[bcnops]|[-=#$:/\\.()*%\d]/g, "");
    if (odd) return `${odd} is no sign of one; an element beyond B C N O P S F Cl Br I stands in [ ]`;
    const count = (sign) => outside.split(sign).length - 1;
    if (count("(") !== count(")")) return "a branch ( ) has only one end";
    const rings = outside.match(/%\d\d|\d/g) ?? [];
    const open = rings.find((ring) => rings.filter((other) => other === ring).length % 2);
    if (open) return `ring ${open} is not closed`;
    const atoms = atomsOf(smiles);
    if (!atoms?.length) return "it cannot be read as one";
    const full = atoms.find((atom) => atom.known === undefined && !atom.isFlat && isOverfull(atom));
    if (!full) return "";
    const bonds = `${NAMES[full.element] ?? full.element} with ${full.bonds} bonds`;
    return full.element === "N" ? `${bonds}; one with a charge is written [N+]` : bonds;
  }

  /** The net charge of a SMILES as typed; 0 for what is none. */
  const charge = (smiles) => (atomsOf(smiles) ?? []).reduce((sum, atom) => sum + atom.charge, 0);

  /** Whether an atom without brackets has more bonds than it can; nitro and azido groups may be drawn without charges. */
  function isOverfull({ element, bonds }) {
    return bonds > VALENCES[element].at(-1) || (element === "N" && bonds === 4);
  }

  return { hill, outline, fault, charge };
})();
