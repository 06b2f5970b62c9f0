// Small things that several parts of the page need.

const dark = matchMedia("(prefers-color-scheme: dark)");

/** The value of a custom property of the style sheet. */
const ink = (name) => getComputedStyle(document.documentElement).getPropertyValue(name).trim();

/** A button that is there only because a script runs. */
const button = (text, act) => {
  const made = document.createElement("button");
  made.type = "button";
  made.textContent = text;
  made.addEventListener("click", act);
  return made;
};

// paper has no folds: open everything before printing, and fold it again as it was
let folded = [];
addEventListener("beforeprint", () => {
  folded = [...document.querySelectorAll("details:not([open])")];
  for (const one of folded) one.open = true;
});
addEventListener("afterprint", () => {
  for (const one of folded) one.open = false;
});

// all runs at once
const runs = document.querySelectorAll("details.run");
if (runs.length > 1) {
  const tools = document.createElement("div");
  tools.className = "tools";
  const all = button("Unfold all runs", () => {
    const open = ![...runs].every((one) => one.open);
    for (const one of runs) one.open = open;
    all.textContent = open ? "Fold all runs" : "Unfold all runs";
  });
  tools.append(all);
  runs[0].before(tools);
}
