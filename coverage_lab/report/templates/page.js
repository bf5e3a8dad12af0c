"use strict";
// Scripts only add convenience: without them every table is complete, in catalogue order, and every method described.
document.documentElement.classList.add("scripted");

// --- sorting
const detailOf = (row) => row.nextElementSibling?.classList.contains("detail") ? row.nextElementSibling : null;
for (const table of document.querySelectorAll("table.sortable")) {
  const body = table.tBodies[0];
  const heads = [...table.tHead.rows[0].cells];
  const key = (row, k) => {
    const cell = row.cells[k];
    return cell.dataset.sort === undefined ? null : Number(cell.dataset.sort);
  };
  const compare = (k, numeric) => (a, b) => {
    if (!numeric) return a.cells[k].textContent.localeCompare(b.cells[k].textContent, "en");
    return key(a, k) - key(b, k);
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
      const rows = [...body.rows].filter((row) => !row.classList.contains("detail"));
      const details = new Map(rows.map((row) => [row, detailOf(row)]));
      const numeric = rows.some((row) => key(row, k) !== null);
      const known = rows.filter((row) => !numeric || key(row, k) !== null);
      const missing = rows.filter((row) => numeric && key(row, k) === null);
      known.sort(compare(k, numeric));
      if (down) known.reverse();
      for (const row of [...known, ...missing]) body.append(row, ...[details.get(row)].filter(Boolean));
      for (const other of heads) other.removeAttribute("aria-sort");
      head.setAttribute("aria-sort", down ? "descending" : "ascending");
    });
  });
}

// --- rows that open to what the method is
const methods = document.getElementById("t-methods");
const rows = [...methods.tBodies[0].rows];
const close = (row) => {
  detailOf(row)?.remove();
  row.querySelector("th button").setAttribute("aria-expanded", "false");
};
const open = (row, card) => {
  const detail = document.createElement("tr");
  detail.className = "detail";
  detail.id = `d-${card.id}`;
  const cell = detail.insertCell();
  cell.colSpan = row.cells.length;
  const inner = document.createElement("div");
  inner.append(card.querySelector("dl").cloneNode(true));
  cell.append(inner);
  row.after(detail);
  row.querySelector("th button").setAttribute("aria-expanded", "true");
};
for (const row of rows) {
  const link = row.querySelector("th a");
  const card = document.getElementById(link.hash.slice(1));
  const button = document.createElement("button");
  button.type = "button";
  button.textContent = link.textContent;
  button.setAttribute("aria-expanded", "false");
  button.addEventListener("click", () => (detailOf(row) ? close(row) : open(row, card)));
  link.replaceWith(button);
}

// --- narrowing the table down
const filter = document.getElementById("filter");
const words = document.getElementById("filter-words");
const passing = document.getElementById("filter-passes");
const said = document.getElementById("filter-said");
const narrow = () => {
  const wanted = words.value.trim().toLowerCase();
  let shown = 0;
  for (const row of rows) {
    const named = row.cells[0].textContent.toLowerCase().includes(wanted);
    row.hidden = !(named && (!passing.checked || row.querySelector("td.yes")));
    if (row.hidden) close(row);
    else shown += 1;
  }
  said.textContent = shown === rows.length ? "" : `${shown} of ${rows.length} methods shown`;
};
words.addEventListener("input", narrow);
passing.addEventListener("change", narrow);
filter.hidden = false;

// --- the interval for a count
const box = document.getElementById("box");
if (box) {
  const known = JSON.parse(document.getElementById("box-limits").textContent);
  const [lower, upper] = [known.lower.split(" "), known.upper.split(" ")];
  const events = document.getElementById("box-events");
  const trials = document.getElementById("box-trials");
  const answer = document.getElementById("box-answer");
  const whole = (field) => {
    const text = field.value.replace(/\s/g, "");
    return /^\d{1,9}$/.test(text) ? Number(text) : null;
  };
  const command = (x, n) => [" In the folder of this page run: ", `coverage-lab interval ${x ?? "EVENTS"} ${n} --from .`];
  const reply = (x, n) => {
    if (n === null) return ["Trials: a whole number."];
    if (n !== known.n) return [`This page answers for ${known.n} trials only, not for ${n}.`, ...command(x, n)];
    if (events.value.trim() === "") return ["Type the number of events."];
    if (x === null || x > n) return [`Events: a whole number from 0 to ${n}.`];
    const k = x - known.first;
    if (!(k in lower)) return [`${x} events are so unlikely under the plan that they are not listed here.`, ...command(x, n)];
    const limits = known.phrase.replace("LOWER", `${lower[k]}\u00a0%`).replace("UPPER", `${upper[k]}\u00a0%`);
    const caution = x === 0 ? ` ${known.zero}` : x === n ? ` ${known.all}` : "";
    return [`${x} of ${n}: ${limits}.${caution}`];
  };
  const show = () => {
    const [sentence, lead, line] = reply(whole(events), whole(trials));
    const parts = [sentence];
    if (line) {
      const code = document.createElement("code");
      code.textContent = line;
      parts.push(lead, code);
    }
    answer.replaceChildren(...parts);
  };
  events.addEventListener("input", show);
  trials.addEventListener("input", show);
  box.hidden = false;
}
