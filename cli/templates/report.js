(function () {
  "use strict";
  const table = document.getElementById("table");
  if (!table) return;
  const body = table.tBodies[0];
  const rows = Array.from(body.rows);
  const heads = Array.from(table.tHead.rows[0].cells);
  const controls = document.querySelector(".controls");
  const find = document.getElementById("find");
  const verdict = document.getElementById("verdict");
  const sort = document.getElementById("sort");
  const direction = document.getElementById("direction");
  const shown = document.getElementById("shown");
  const all = shown.textContent;
  const words = new Intl.Collator("en", { numeric: true, sensitivity: "base" });
  const texts = rows.map((row) => row.textContent.toLowerCase());

  function key(row, column) {
    const cell = row.cells[column];
    if (cell.dataset.key !== undefined) return Number(cell.dataset.key);
    const text = cell.textContent.trim();
    return text === "" ? null : text;
  }

  function compare(a, b, sign) {
    if (a.key === null || b.key === null) return (a.key === null) - (b.key === null) || a.at - b.at;
    if (typeof a.key === typeof b.key) {
      const order = typeof a.key === "number" ? a.key - b.key : words.compare(a.key, b.key);
      return sign * order || a.at - b.at;
    }
    return typeof a.key === "number" ? -1 : 1;
  }

  function arrange() {
    const column = Number(sort.value);
    const sign = Number(direction.value);
    const keyed = rows.map((row, at) => ({ row, at, key: key(row, column) }));
    keyed.sort((a, b) => compare(a, b, sign));
    body.append(...keyed.map((entry) => entry.row));
    heads.forEach((head, k) => {
      if (k === column) head.setAttribute("aria-sort", sign > 0 ? "ascending" : "descending");
      else head.removeAttribute("aria-sort");
    });
  }

  function filter() {
    const wanted = find.value.toLowerCase().split(/\s+/).filter(Boolean);
    let count = 0;
    rows.forEach((row, k) => {
      const keep = (!verdict.value || row.dataset.verdict === verdict.value) && wanted.every((w) => texts[k].includes(w));
      row.hidden = !keep;
      if (keep) count += 1;
    });
    shown.textContent = count === rows.length ? all : count + " of " + rows.length + " " + table.dataset.things + " match.";
  }

  heads.forEach((head, k) => {
    const button = document.createElement("button");
    button.type = "button";
    button.textContent = head.textContent;
    head.replaceChildren(button);
    button.addEventListener("click", () => {
      direction.value = Number(sort.value) === k && direction.value === "1" ? "-1" : "1";
      sort.value = String(k);
      arrange();
    });
  });
  sort.addEventListener("change", arrange);
  direction.addEventListener("change", arrange);
  find.addEventListener("input", filter);
  verdict.addEventListener("change", filter);
  controls.addEventListener("submit", (event) => event.preventDefault());
  controls.hidden = false;
})();
