// Printing: the drawings are made anew at the size of the sheet, at once, for no printer waits for the next frame.

function printSheet(plan, profile, place) {
  const root = document.documentElement;
  const details = document.querySelector(".findings details");
  const cards = document.getElementById("cards");
  const workspace = cards.parentElement;
  const sheet = workspace.parentElement;
  let printing = false;
  let wasOpen = false;

  function begin() {
    if (!printing) {
      printing = true;
      wasOpen = details.open;
      details.open = true;
      root.classList.add("printing");
      // The card that is open follows the sheet; the page's own place for it is beside the drawings.
      if (place.boring() !== null || place.current() !== null) sheet.after(cards);
    }
    plan.fitSheet();
    profile.draw();
  }

  function end() {
    if (!printing) return;
    printing = false;
    details.open = wasOpen;
    root.classList.remove("printing");
    if (cards.parentElement !== workspace) workspace.append(cards);
    plan.leaveSheet();
    profile.draw();
  }

  // Before printing the window still has its screen layout, so the sheet is given its size by a class; where the
  // browser tells of the layout on paper as well, the drawings follow it.
  window.addEventListener("beforeprint", begin);
  window.addEventListener("afterprint", end);
  window.matchMedia("print").addEventListener("change", (event) => (event.matches ? begin() : end()));
}
