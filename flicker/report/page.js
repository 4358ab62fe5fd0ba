// What a mark of a figure stands for is said below the figure as well: for touch, and for who cannot wait for a tip.
for (const figure of document.querySelectorAll("figure")) {
  const said = figure.querySelector("output");
  if (!said) continue;
  const resting = said.textContent;
  const say = (event) => {
    const title = event.target.closest("g, rect")?.querySelector(":scope > title");
    said.textContent = title ? title.textContent : resting;
  };
  figure.addEventListener("pointerover", say);
  figure.addEventListener("pointerdown", say);
  figure.addEventListener("focusin", say);
  figure.addEventListener("pointerleave", (event) => {
    if (event.pointerType === "mouse") said.textContent = resting; // a finger that is lifted leaves too
  });
}
