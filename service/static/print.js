"use strict";
/* Paper cannot be unfolded: every fold opens before printing and closes again afterwards. */
let opened = [];
addEventListener("beforeprint", () => {
  opened = [...document.querySelectorAll("details:not([open])")];
  for (const fold of opened) fold.open = true;
});
addEventListener("afterprint", () => {
  for (const fold of opened) fold.open = false;
  opened = [];
});
