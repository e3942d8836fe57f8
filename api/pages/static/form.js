// Redraws the answer while somebody types. Without it the form posts itself.
"use strict";
const form = document.getElementById("try");
let waiting, asked = 0;

async function redraw() {
  const turn = ++asked;
  let text;
  try {
    const response = await fetch(form.action, { method: "POST", body: new URLSearchParams(new FormData(form)) });
    if (!response.ok) return;
    text = await response.text();
  } catch {
    return; // the button still works
  }
  // Only the last question is answered.
  if (turn !== asked) return;
  const fresh = new DOMParser().parseFromString(text, "text/html").getElementById("answer");
  const shown = document.getElementById("answer");
  if (!fresh || !shown) return;
  // While what is typed cannot be drawn, the drawing before it stays.
  if (fresh.querySelector("[role=alert]") && !fresh.querySelector("figure")) {
    const notice = shown.querySelector("[role=alert]");
    if (notice) notice.remove();
    shown.prepend(document.adoptNode(fresh.querySelector("[role=alert]")));
    return;
  }
  shown.replaceWith(document.adoptNode(fresh));
}

if (form) {
  form.addEventListener("input", () => {
    clearTimeout(waiting);
    waiting = setTimeout(redraw, 250);
  });
}
