// Puts the parts together. `plan_map` and the three layers are made by folium, above this file in the same script.

(function start() {
  const data = readData();
  const lengths = makeLengths(data.corridor.unit);
  const chainage = makeChainage(data.corridor.chainage, data.length);
  data.chainageJumps = chainage.equations.length > 0 || data.corridor.chainage.breaks[0][1] !== 0;
  const place = makePlace(data);
  const colors = makeColors(data);
  const byId = (id) => document.getElementById(id);
  const nodes = { canvas: byId("profile"), cursorCanvas: byId("profile-cursor"), overviewCanvas: byId("overview"), exaggeration: byId("exaggeration"), part: byId("part") };

  const plan = makePlan(plan_map, { grid: plan_grid, line: plan_line, borings: plan_borings }, data, colors, chainage, place);
  const profile = makeProfile(nodes, data, colors, chainage, lengths, place);
  profile.onView(plan.showInView);
  const findings = makeFindings(data);
  const stretchCard = makeStretchCard(data, colors, chainage, lengths);
  const boringCard = makeBoringCard(data, chainage, lengths, findings, stretchCard);
  drawGroupNames(colors, data);
  drawSummary(data, lengths, chainage, findings);

  const select = byId("color-by");
  for (const [name, mode] of Object.entries(colors.modes)) {
    if (data.hasFormation || name === "group" || name === "evidence") select.append(element("option", { value: name }, mode.title));
  }
  function color() {
    const mode = colors.modes[select.value];
    plan.color(mode);
    profile.color(mode);
    drawLegend(mode, colors, data);
  }
  select.addEventListener("change", color);

  listenToProfile(nodes, profile, data, plan, place);
  byId("zoom-in").addEventListener("click", () => profile.zoom(0.5, place.held()?.distance));
  byId("zoom-out").addEventListener("click", () => profile.zoom(2));
  byId("zoom-all").addEventListener("click", () => {
    profile.show(0, data.length);
    plan.showWhole();
  });
  if (!data.groundKnown) {
    // Without ground levels there is nothing to plot but depths.
    byId("vertical").value = "depth";
    byId("vertical").disabled = true;
    profile.byDepth(true);
  }
  byId("vertical").addEventListener("change", (event) => profile.byDepth(event.target.value === "depth"));

  const openBoringAt = listenToGoTo(data, chainage, profile, plan, place);
  findings.onOpen((number) => {
    byId("views").scrollIntoView({ block: "start" });
    openBoringAt(number, "go");
  });

  let openBoring = null;
  place.onChange((state) => {
    const shown = state.place;
    byId("boring").hidden = state.boring === null;
    if (state.boring !== openBoring) {
      openBoring = state.boring;
      if (openBoring !== null) {
        boringCard.show(openBoring).addEventListener("click", () => {
          place.closeBoring("card");
          nodes.canvas.focus();
        });
        // On a phone the card stands below the drawings; a card that nobody sees was not opened.
        if (window.matchMedia("(max-width: 820px)").matches) byId("boring").scrollIntoView({ block: "start" });
        else byId("cards").scrollTop = 0;
        byId("announce").textContent = `Boring ${data.borings.name[openBoring]} is open.`;
      }
    }
    byId("stretch-hint").hidden = Boolean(shown);
    byId("stretch").hidden = !shown;
    if (!shown) return;
    stretchCard.show(shown.distance, shown.depth);
    nodes.canvas.setAttribute("aria-valuenow", shown.distance.toFixed(1));
    nodes.canvas.setAttribute("aria-valuetext", stretchCard.sentence(shown.distance, shown.depth));
    if (state.source === "go") byId("announce").textContent = stretchCard.sentence(shown.distance, shown.depth);
  });
  nodes.canvas.setAttribute("aria-valuemax", data.length.toFixed(1));

  function resize() {
    plan.resize();
    profile.redraw();
  }
  color();
  plan.resize(); // the legend has just taken its room
  profile.show(0, firstStretch(nodes.canvas, profile.scale));
  new ResizeObserver(resize).observe(byId("views"));
  printSheet(plan, profile, place);
  requestAnimationFrame(() => {
    document.documentElement.dataset.ready = "yes";
    performance.mark("geomap-ready");
  });
})();
