"use strict";
// Sorting only adds convenience: without it the tables are complete and in catalogue order.
for (const table of document.querySelectorAll("table.sortable")) {
  const body = table.tBodies[0];
  const heads = [...table.tHead.rows[0].cells];
  const key = (row, k) => {
    const cell = row.cells[k];
    return cell.dataset.sort === undefined ? null : Number(cell.dataset.sort);
  };
  const compare = (k, numeric) => (a, b) => {
    if (!numeric) return a.cells[k].textContent.localeCompare(b.cells[k].textContent, "en");
    const [x, y] = [key(a, k), key(b, k)];
    return x === null || y === null ? 0 : x - y;
  };
  heads.forEach((head, k) => {
    const button = document.createElement("button");
    button.type = "button";
    button.textContent = head.textContent;
    const printed = document.createElement("span"); // a heading that holds a button is not repeated on printed pages
    printed.className = "printed";
    printed.textContent = head.textContent;
    head.replaceChildren(button, printed);
    button.addEventListener("click", () => {
      const down = head.getAttribute("aria-sort") === "ascending";
      const rows = [...body.rows];
      const numeric = rows.some((row) => key(row, k) !== null);
      const known = rows.filter((row) => !numeric || key(row, k) !== null);
      const missing = rows.filter((row) => numeric && key(row, k) === null);
      known.sort(compare(k, numeric));
      if (down) known.reverse();
      body.append(...known, ...missing);
      for (const other of heads) other.removeAttribute("aria-sort");
      head.setAttribute("aria-sort", down ? "descending" : "ascending");
    });
  });
}
