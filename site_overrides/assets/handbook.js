// What every page does: paper, copying, printing, addresses.
"use strict";
(() => {
  // --- light or dark paper -----------------------------------------------------------------------------------------

  const PAPERS = ["system", "light", "dark"];
  const root = document.documentElement;

  function keepPaper(paper) {
    if (paper === "system") delete root.dataset.paper;
    else root.dataset.paper = paper;
    try {
      localStorage.setItem("handbook-paper", paper);
    } catch {
      // Not kept; it holds for this page.
    }
  }

  for (const button of document.querySelectorAll("button.hb-paper")) {
    const label = button.querySelector("span");
    const show = () => { label.textContent = `Paper: ${root.dataset.paper ?? "system"}`; };
    button.addEventListener("click", () => {
      const next = PAPERS[(PAPERS.indexOf(root.dataset.paper ?? "system") + 1) % PAPERS.length];
      keepPaper(next);
      show();
    });
    show();
    button.hidden = false;
  }

  // --- copy --------------------------------------------------------------------------------------------------------

  const said = document.createElement("p");
  said.className = "hb-said";
  said.setAttribute("role", "status");
  document.body.append(said);

  /** Copy without the clipboard interface, which browsers offer on secure addresses only. */
  function copiedByHand(text) {
    const area = document.createElement("textarea");
    area.value = text;
    area.className = "hb-said";
    area.setAttribute("aria-hidden", "true");
    document.body.append(area);
    area.select();
    const done = document.execCommand("copy");
    area.remove();
    return done;
  }

  async function copied(text) {
    try {
      await navigator.clipboard.writeText(text);
      return true;
    } catch {
      return copiedByHand(text);
    }
  }

  for (const button of document.querySelectorAll("button[data-copy]")) {
    button.hidden = false;
    button.addEventListener("click", async () => {
      const done = await copied(button.dataset.copy);
      button.focus(); // copying by hand takes the focus away
      button.dataset.state = done ? "done" : "failed";
      said.textContent = done ? `${button.dataset.what} copied` : "This browser did not let the page copy";
      setTimeout(() => { delete button.dataset.state; said.textContent = ""; }, 2500);
    });
  }

  // --- paper that is printed on ------------------------------------------------------------------------------------

  // A printed page shows what to do about each caution; what was closed is closed again afterwards.
  const closed = [];
  addEventListener("beforeprint", () => {
    for (const details of document.querySelectorAll(".hb-cautions details:not([open])")) {
      details.open = true;
      closed.push(details);
    }
  });
  addEventListener("afterprint", () => {
    for (const details of closed.splice(0)) details.open = false;
  });

  // --- addresses ---------------------------------------------------------------------------------------------------

  // Opened from a folder instead of a server, a link to "e/NS…/" finds no page: name the file in it.
  if (location.protocol === "file:") {
    for (const link of document.querySelectorAll("a[href]")) {
      const target = new URL(link.href);
      if (target.protocol === "file:" && target.pathname.endsWith("/")) {
        target.pathname += "index.html";
        link.href = target.href;
      }
    }
  }

  // A wrong address that names an entry: say which.
  const missing = document.querySelector(".hb-missing");
  const named = location.pathname.match(/\/e\/(NS[0-9A-Z]{7})(?:\/|$)/i);
  if (missing && named) {
    missing.querySelector(".hb-id").textContent = named[1].toUpperCase();
    missing.hidden = false;
  }
})();
