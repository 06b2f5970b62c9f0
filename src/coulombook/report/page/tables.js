// Tables sort by any column and copy as tab-separated values, both from the full figures behind the cells.

/** Whether a cell stands in a column of figures. */
const numeric = (cell) => cell.closest("table").tHead.rows[0].cells[cell.cellIndex].classList.contains("n");

/** The figure behind a cell; where there is none, the one it shows. */
const figureOf = (cell) => {
  if (cell.dataset.v !== undefined) return Number(cell.dataset.v);
  const shown = numeric(cell) ? Number.parseFloat(cell.textContent.replace("\u2212", "-").replace("<", "")) : NaN;
  return Number.isNaN(shown) ? null : shown;
};

/** Cells in rising order: figures before words, absent ones left aside by the caller. */
const compare = (a, b) => {
  const x = figureOf(a);
  const y = figureOf(b);
  if (x !== null && y !== null) return x - y;
  if (x !== null || y !== null) return x !== null ? -1 : 1;
  return a.textContent.localeCompare(b.textContent, "en", { numeric: true });
};

const absent = (cell) => cell.dataset.v === undefined && (cell.textContent === "" || cell.textContent === "\u2013");

const sort = (table, rows, heads, place) => {
  const head = heads[place];
  const next = { none: "ascending", ascending: "descending", descending: "none" }[head.getAttribute("aria-sort") || "none"];
  for (const one of heads) one.removeAttribute("aria-sort");
  let sorted = rows;
  if (next !== "none") {
    head.setAttribute("aria-sort", next);
    const there = rows.filter((row) => !absent(row.cells[place]));
    const side = next === "ascending" ? 1 : -1;
    // the order of equal ones stays that of the table
    there.sort((a, b) => side * compare(a.cells[place], b.cells[place]));
    sorted = [...there, ...rows.filter((row) => absent(row.cells[place]))];
  }
  table.tBodies[0].append(...sorted);
};

/** The table as text: heads as in the files, a value and its uncertainty in columns of their own. */
const asText = (table) => {
  const heads = [...table.tHead.rows[0].cells];
  const line = heads.flatMap((head) => [head.dataset.h, ...(head.dataset.uh ? [head.dataset.uh] : [])]);
  const rows = [...table.tBodies[0].rows].map((row) =>
    [...row.cells].flatMap((cell, place) => {
      const shown = numeric(cell) ? cell.textContent.replaceAll("\u2212", "-") : cell.textContent;
      const word = absent(cell) ? "" : cell.dataset.v ?? cell.dataset.c ?? shown;
      return [word, ...(heads[place].dataset.uh ? [cell.dataset.u ?? ""] : [])];
    }),
  );
  return [line, ...rows].map((cells) => cells.join("\t")).join("\n") + "\n";
};

const copy = async (text) => {
  try {
    await navigator.clipboard.writeText(text);
  } catch {
    // a page opened from a disk may not use the clipboard by itself; what is selected may be copied
    const field = document.createElement("textarea");
    field.value = text;
    document.body.append(field);
    field.select();
    const done = document.execCommand("copy");
    field.remove();
    if (!done) throw new Error("the browser does not allow copying");
  }
};

// what a head means is said in the first of tables that are alike
const meanings = new Map();
for (const table of document.querySelectorAll("table[data-like]")) {
  for (const head of table.tHead.rows[0].cells) {
    const key = `${table.dataset.like} ${head.dataset.h}`;
    if (head.title) meanings.set(key, head.title);
    else head.title = meanings.get(key) ?? "";
  }
}

for (const table of document.querySelectorAll(".scroll > table")) {
  const heads = [...table.tHead.rows[0].cells];
  const rows = [...table.tBodies[0].rows];
  for (const [place, head] of heads.entries()) {
    const act = button("", () => sort(table, rows, heads, place));
    act.append(...head.childNodes);
    if (head.title) act.title = head.title;
    head.removeAttribute("title");
    head.append(act);
  }
  const said = document.createElement("span");
  said.setAttribute("role", "status");
  const tools = document.createElement("div");
  tools.className = "tools";
  const act = button("Copy table", async () => {
    try {
      await copy(asText(table));
      said.textContent = "Copied as tab-separated values.";
    } catch (error) {
      said.textContent = `Not copied: ${error.message}.`;
    }
  });
  act.setAttribute("aria-label", `Copy ${table.parentElement.getAttribute("aria-label")}`);
  tools.append(act, said);
  table.parentElement.after(tools);
}
