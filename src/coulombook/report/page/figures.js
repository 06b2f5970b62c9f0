// Marks of the drawings say their value when pointed at or reached by the arrow keys.

const tip = document.createElement("div");
tip.className = "tip";
tip.hidden = true;
// the mark itself carries the same words
tip.setAttribute("aria-hidden", "true");
document.body.append(tip);

const show = (mark) => {
  const box = mark.getBoundingClientRect();
  tip.textContent = mark.dataset.m;
  tip.hidden = false;
  const own = tip.getBoundingClientRect();
  const left = Math.min(Math.max(box.left + box.width / 2 - own.width / 2, 4), innerWidth - own.width - 4);
  const above = box.top - own.height - 8;
  tip.style.left = `${Math.max(left, 4)}px`;
  tip.style.top = `${above > 4 ? above : box.bottom + 8}px`;
};
const hide = () => {
  tip.hidden = true;
};

for (const drawing of document.querySelectorAll(".drawing")) {
  const marks = [...drawing.querySelectorAll(".mark")];
  for (const mark of marks) {
    // the browser would show the title a second time, and later
    const title = mark.querySelector("title");
    mark.dataset.m = title.textContent;
    title.remove();
    mark.setAttribute("role", "img");
    mark.setAttribute("aria-label", mark.dataset.m);
    mark.setAttribute("tabindex", mark === marks[0] ? "0" : "-1");
  }
  const go = (place) => {
    for (const mark of marks) mark.setAttribute("tabindex", "-1");
    marks[place].setAttribute("tabindex", "0");
    marks[place].focus();
  };
  drawing.addEventListener("pointerover", (event) => {
    const mark = event.target.closest(".mark");
    if (mark) show(mark);
    else hide();
  });
  drawing.addEventListener("pointerleave", hide);
  drawing.addEventListener("focusin", (event) => show(event.target.closest(".mark")));
  drawing.addEventListener("focusout", hide);
  drawing.addEventListener("keydown", (event) => {
    const place = marks.indexOf(event.target.closest(".mark"));
    const steps = { ArrowRight: place + 1, ArrowDown: place + 1, ArrowLeft: place - 1, ArrowUp: place - 1, Home: 0, End: marks.length - 1 };
    if (event.key === "Escape") hide();
    if (place < 0 || !(event.key in steps)) return;
    event.preventDefault();
    go((steps[event.key] + marks.length) % marks.length);
  });
}
// a mark that is reached by a key may scroll into view, and its words with it
addEventListener("scroll", () => {
  const mark = document.activeElement?.closest(".mark");
  if (mark && !tip.hidden) show(mark);
  else hide();
}, { passive: true });
