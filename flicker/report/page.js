// What a mark of a figure stands for is said below the figure as well: for touch, for the keyboard, and for who
// cannot wait for a tip. The tab key enters a figure once; arrow keys go from mark to mark.
for (const figure of document.querySelectorAll("figure")) {
  const said = figure.querySelector("output");
  if (!said) continue;
  const resting = said.textContent;
  const titleOf = (target) => target.closest("g, rect")?.querySelector(":scope > title");
  const say = (event) => (said.textContent = titleOf(event.target)?.textContent ?? resting);
  figure.addEventListener("pointerover", say);
  figure.addEventListener("pointerdown", say);
  figure.addEventListener("focusin", say);
  figure.addEventListener("pointerleave", (event) => {
    if (event.pointerType === "mouse") said.textContent = resting; // a finger that is lifted leaves too
  });

  const marks = [...figure.querySelectorAll("g, rect")].filter((one) => one.querySelector(":scope > title"));
  const left = (one) => one.getCTM().e;
  const row = marks.filter((one) => one.getAttribute("y") === marks[0].getAttribute("y")).length;
  const inRows = row < marks.length;
  if (!inRows) marks.sort((one, other) => left(one) - left(other));
  marks.forEach((one, place) => one.setAttribute("tabindex", place ? -1 : 0));
  const steps = { ArrowRight: 1, ArrowLeft: -1, ArrowDown: inRows ? row : 1, ArrowUp: inRows ? -row : -1 };
  figure.addEventListener("keydown", (event) => {
    const place = marks.indexOf(event.target);
    if (place < 0 || !(event.key in steps)) return;
    event.preventDefault();
    marks[place + steps[event.key]]?.focus();
  });
}
