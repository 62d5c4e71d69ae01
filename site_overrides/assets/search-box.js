// The search box of the header: a combobox whose list is filled by search.js. The index is fetched when the box is first
// used, as scripts, so that a book opened from a folder has it too; what is typed meanwhile is looked up once it is there.
"use strict";
(() => {
  const form = document.querySelector("form.hb-search");
  if (!form) return;
  const MOST = 12;
  const KEYS_OFF = "handbook-search-keys-off";
  const box = form.querySelector("input");
  const panel = form.querySelector(".hb-search__panel");
  const list = form.querySelector("[role=listbox]");
  const count = form.querySelector("[role=status]");
  const help = form.querySelector(".hb-search__help");
  const keys = form.querySelector(".hb-search__keys");
  let finder = null;
  let loading = null;
  let active = -1;
  let cameFrom = null;
  let opensFirst = false;

  // --- the index ------------------------------------------------------------------------------------------------

  function loaded(source) {
    return new Promise((resolve, reject) => {
      const script = document.createElement("script");
      Object.assign(script, { src: source, async: false, onload: resolve, onerror: reject });
      document.head.append(script);
    });
  }

  function load() {
    if (finder) return;
    loading ??= Promise.all(form.dataset.scripts.split(" ").map(loaded)).then(() => {
      finder = handbookFinder(handbookSearch);
      show();
      return loaded(form.dataset.notes);
    }).then(() => {
      finder.addNotes(handbookNotes);
      if (active < 0) show();
    }).catch(() => {
      if (finder) return;
      loading = null;
      count.textContent = "The index of the book could not be read; try again, or take the lists.";
    }).finally(() => list.setAttribute("aria-busy", "false"));
    list.setAttribute("aria-busy", "true"); // hits may change once more, when the long texts are there
  }

  // --- the list -------------------------------------------------------------------------------------------------

  function address(path) {
    const target = new URL(form.dataset.root + path, location.href);
    if (target.protocol === "file:" && target.pathname.endsWith("/")) target.pathname += "index.html";
    return target.href;
  }

  function part(name, text) {
    const span = document.createElement("span");
    span.className = `hb-hit__${name}`;
    span.textContent = text;
    return span;
  }

  function option(hit, place) {
    const link = document.createElement("a");
    Object.assign(link, { id: `hb-hit-${place}`, className: "hb-hit", href: address(hit.path), tabIndex: -1 });
    link.setAttribute("role", "option");
    link.setAttribute("aria-selected", "false");
    const marks = [["id", hit.id || "page"], ["status", hit.status === "current" ? "" : hit.status], ["verdict", hit.verdict]];
    const head = part("marks", "");
    head.append(...marks.filter(([, text]) => text).map(([name, text]) => part(name, text)));
    link.append(part("title", hit.title), head, part("why", hit.why));
    if (hit.outcome) link.append(part("outcome", hit.outcome));
    return link;
  }

  function inWords({ total, instead, hits }) {
    const found = total === 0 ? "Nothing found" : total === 1 ? "1 found" : `${total} found`;
    const shown = total > hits.length ? `, the first ${hits.length} shown` : "";
    return instead ? `Nothing is spelled like that; for “${instead}”: ${found.toLowerCase()}${shown}` : found + shown;
  }

  function show() {
    const query = box.value.trim();
    help.hidden = query !== "";
    if (!query) list.replaceChildren();
    count.textContent = !query ? "" : finder ? count.textContent : "Reading the index …";
    if (query && finder) {
      const found = finder.find(query, MOST);
      list.replaceChildren(...found.hits.map(option));
      count.textContent = inWords(found);
    }
    list.hidden = list.childElementCount === 0;
    box.setAttribute("aria-expanded", String(!list.hidden));
    mark(-1);
    const { left } = form.getBoundingClientRect();
    panel.style.setProperty("--hb-left", `${-left}px`);
    panel.style.setProperty("--hb-width", `${document.documentElement.clientWidth}px`);
    if (opensFirst && finder) follow();
  }

  function close() {
    help.hidden = list.hidden = true;
    opensFirst = false;
    count.textContent = "";
    box.setAttribute("aria-expanded", "false");
    mark(-1);
  }

  function mark(place) {
    list.children[active]?.setAttribute("aria-selected", "false");
    active = place;
    const chosen = list.children[active];
    if (!chosen) return box.removeAttribute("aria-activedescendant");
    chosen.setAttribute("aria-selected", "true");
    chosen.scrollIntoView({ block: "nearest" });
    box.setAttribute("aria-activedescendant", chosen.id);
  }

  /** Open the marked hit, else the first; while the index is still on its way, once it is there. */
  function follow() {
    opensFirst = !finder && box.value.trim() !== "";
    (list.children[active] ?? list.firstElementChild)?.click();
  }

  // --- keys -----------------------------------------------------------------------------------------------------

  const steps = { ArrowDown: 1, ArrowUp: -1 };

  box.addEventListener("keydown", (event) => {
    if (event.isComposing) return;
    if (event.key in steps) {
      if (list.hidden) show();
      const places = list.childElementCount + 1; // the box itself is one of them
      mark((active + 1 + steps[event.key] + places) % places - 1);
    } else if (event.key === "Escape") {
      close();
      if (cameFrom?.isConnected) cameFrom.focus();
      else box.blur();
    } else return;
    event.preventDefault();
  });
  form.addEventListener("submit", (event) => {
    event.preventDefault();
    follow();
  });
  box.addEventListener("input", () => {
    opensFirst = false;
    load();
    show();
  });
  box.addEventListener("focus", (event) => {
    if (!form.contains(event.relatedTarget)) cameFrom = event.relatedTarget;
    load();
    show();
  });
  form.addEventListener("focusout", (event) => { if (!form.contains(event.relatedTarget)) close(); });
  // A press on a hit must not take the focus first: the list would be gone before the click.
  list.addEventListener("mousedown", (event) => event.preventDefault());

  // One key without a modifier must be easy to switch off (WCAG 2.1.4): speech input may utter it.
  function kept(name, value) {
    try {
      if (value !== undefined) localStorage.setItem(name, value);
      return localStorage.getItem(name);
    } catch {
      return value; // not kept; it holds for this page
    }
  }

  function setKeys(off) {
    keys.setAttribute("aria-pressed", String(!off));
    keys.lastElementChild.textContent = off ? "off" : "on";
    form.classList.toggle("hb-search--no-keys", off);
  }

  setKeys(kept(KEYS_OFF) === "yes");
  keys.addEventListener("click", () => {
    const off = keys.getAttribute("aria-pressed") === "true";
    kept(KEYS_OFF, off ? "yes" : "no");
    setKeys(off);
  });
  document.addEventListener("keydown", (event) => {
    const isTyping = event.target.closest?.("input, textarea, select, [contenteditable]");
    const isOther = event.ctrlKey || event.metaKey || event.altKey || event.isComposing || event.defaultPrevented;
    if (!["/", "s"].includes(event.key) || isTyping || isOther || keys.getAttribute("aria-pressed") !== "true") return;
    event.preventDefault();
    box.focus();
    box.select();
  });
})();
