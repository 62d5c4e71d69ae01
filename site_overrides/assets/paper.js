// Runs before anything is drawn, so that the paper a reader chose is there from the start.
"use strict";
try {
  const chosen = localStorage.getItem("handbook-paper");
  if (chosen === "light" || chosen === "dark") document.documentElement.dataset.paper = chosen;
} catch {
  // A browser that keeps nothing follows the system.
}
