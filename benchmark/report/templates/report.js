"use strict";
const readout = document.createElement("div");
readout.id = "readout";
readout.setAttribute("role", "tooltip");
readout.hidden = true;
document.body.append(readout);
let dismissed = null;
const show = (mark) => {
  if (mark === dismissed) return;
  dismissed = null;
  readout.textContent = mark.getAttribute("aria-label");
  readout.hidden = false;
  const box = mark.getBoundingClientRect();
  const room = document.documentElement.clientWidth - readout.offsetWidth - 8;
  const below = box.bottom + readout.offsetHeight < innerHeight || box.top < readout.offsetHeight;
  readout.style.left = scrollX + Math.max(8, Math.min(box.left, room)) + "px";
  readout.style.top = scrollY + (below ? box.bottom : box.top - readout.offsetHeight) + "px";
};
const markAt = (target) => (target instanceof Element ? target.closest(".chart a") : null);
document.addEventListener("pointerover", (event) => {
  const mark = markAt(event.target);
  const held = markAt(document.activeElement);
  if (mark) show(mark);
  else if (!readout.contains(event.target)) {
    dismissed = held === dismissed ? held : null;
    if (held) show(held);
    else readout.hidden = true;
  }
});
document.addEventListener("keydown", (event) => {
  if (event.key !== "Escape" || readout.hidden) return;
  readout.hidden = true;
  dismissed = document.querySelector(".chart a:hover") || markAt(document.activeElement);
});
for (const chart of document.querySelectorAll(".chart")) {
  const marks = [...chart.querySelectorAll("a")];
  if (!marks.length) continue;
  const hint = chart.closest("figure").querySelector(".hint span");
  if (hint) hint.hidden = false;
  const enter = (mark) => marks.forEach((other) => other.setAttribute("tabindex", other === mark ? "0" : "-1"));
  enter(marks[0]);
  marks.forEach((mark, place) => {
    const title = mark.querySelector("title");
    mark.setAttribute("aria-label", title.textContent);
    title.remove();
    mark.addEventListener("focus", () => {
      enter(mark);
      show(mark);
    });
    mark.addEventListener("blur", () => {
      dismissed = null;
      readout.hidden = true;
    });
    mark.addEventListener("keydown", (event) => {
      const next = { ArrowRight: place + 1, ArrowDown: place + 1, ArrowLeft: place - 1, ArrowUp: place - 1, Home: 0, End: marks.length - 1 }[event.key];
      if (next === undefined) return;
      event.preventDefault();
      if (marks[next]) marks[next].focus();
    });
  });
}
for (const box of document.querySelectorAll(".choose")) {
  const choice = box.querySelector("select");
  const groups = [...document.querySelectorAll(`.group[data-of="${box.dataset.for}"]`)];
  const apply = () => groups.forEach((group) => (group.hidden = Boolean(choice.value) && group.id !== choice.value));
  choice.addEventListener("input", apply);
  box.addEventListener("all", () => {
    choice.value = "";
    apply();
  });
  box.hidden = groups.length < 2;
}
const reveal = () => {
  const place = location.hash.length > 1 && document.getElementById(location.hash.slice(1));
  if (!place) return;
  const details = place.closest("details");
  const group = place.closest(".group[hidden]");
  const row = place.closest("tr[hidden]");
  if (details) details.open = true;
  if (group) document.querySelector(`.choose[data-for="${group.dataset.of}"]`).dispatchEvent(new Event("all"));
  if (row) row.hidden = false;
  place.scrollIntoView({ block: "nearest" });
};
addEventListener("hashchange", reveal);
reveal();
for (const box of document.querySelectorAll(".filter")) {
  const key = box.dataset.for;
  const rows = [...document.querySelectorAll("#" + key + "-table tbody tr")];
  const text = document.getElementById(key + "-text");
  const evidence = document.getElementById(key + "-evidence");
  const setBy = document.getElementById(key + "-set-by");
  const count = box.querySelector(".count");
  const apply = () => {
    const words = text.value.toLowerCase().split(/\s+/).filter(Boolean);
    let shown = 0;
    for (const row of rows) {
      const content = row.textContent.toLowerCase();
      const fits =
        words.every((word) => content.includes(word)) &&
        (!evidence.value || row.dataset.evidence === evidence.value) &&
        (!setBy.value || row.dataset.setBy === setBy.value);
      row.hidden = !fits;
      shown += fits ? 1 : 0;
    }
    count.textContent = shown + " of " + rows.length + " rows";
  };
  for (const field of [text, evidence, setBy]) field.addEventListener("input", apply);
  box.hidden = false;
}
