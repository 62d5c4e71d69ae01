// Opened from a folder instead of a server, a link to "e/NS…/" finds no page: name the file in it.
"use strict";
if (location.protocol === "file:") {
  for (const link of document.querySelectorAll("a[href]")) {
    const target = new URL(link.href);
    if (target.protocol === "file:" && target.pathname.endsWith("/")) {
      target.pathname += "index.html";
      link.href = target.href;
    }
  }
}
