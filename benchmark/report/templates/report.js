"use strict";
for (const box of document.querySelectorAll(".read")) {
  const table = document.getElementById(box.dataset.for + "-table");
  const heads = [...table.tHead.rows[0].cells].map((cell) => cell.textContent.replaceAll("_", " "));
  const field = box.querySelector("input");
  const shown = box.querySelector("output");
  const read = () => {
    const cells = [...table.tBodies[0].rows[field.value].cells].map((cell) => cell.textContent.trim());
    const words = heads.map((head, i) => (cells[i] ? head + " " + cells[i] : "")).filter(Boolean).join("; ");
    shown.textContent = words;
    field.setAttribute("aria-valuetext", words);
  };
  field.addEventListener("input", read);
  read();
  box.hidden = false;
}
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
