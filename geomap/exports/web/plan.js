// The plan: a Leaflet map made by folium, without a background of its own. We draw the coordinate grid, the
// line in its colors, the borings and the labels.

const HIT_BORING = 11; // pixels; a boring wins over the line beside it
const HIT_LINE = 26;
const LINE_WIDTH = 8;

function makePlan(map, layers, data, colors, chainage, place) {
  const { at, lat, lon } = data.plan;
  const points = at.map((_, i) => L.latLng(lat[i], lon[i]));
  const bounds = L.latLngBounds(points).pad(0.02);
  const still = window.matchMedia("(prefers-reduced-motion: reduce)").matches;
  const borings = data.plan.borings.lat.map((y, i) => (y === null ? null : L.latLng(y, data.plan.borings.lon[i])));

  function pointAt(distance) {
    const i = Math.min(Math.max(lastAtOrBelow(at, distance), 0), at.length - 2);
    const share = (distance - at[i]) / (at[i + 1] - at[i] || 1);
    return L.latLng(lat[i] + share * (lat[i + 1] - lat[i]), lon[i] + share * (lon[i + 1] - lon[i]));
  }

  // Vertices from one distance to another, the ends included.
  function stretch(from, to) {
    const first = lastAtOrBelow(at, from) + 1;
    const last = lastAtOrBelow(at, to - 1e-6);
    return [pointAt(from), ...points.slice(first, last + 1), pointAt(to)];
  }

  function drawGrid() {
    const line = (item, style) => L.polyline(item.lat.map((y, i) => [y, item.lon[i]]), { interactive: false, ...style }).addTo(layers.grid);
    const lines = data.plan.grid;
    const fine = lines.filter((item) => !item.coarse).map((item) => line(item, { color: "#e3e4dd", weight: 1 }));
    lines.filter((item) => item.coarse).forEach((item) => line(item, { color: "#cfd2c9", weight: 1 }));
    // The fine set only helps where the coarse one leaves large empty squares.
    return () => {
      const show = gridPixels() > 220;
      fine.forEach((item) => item.setStyle({ opacity: show ? 1 : 0 }));
    };
  }

  function gridPixels() {
    const coarse = data.plan.grid.filter((item) => item.coarse && item.axis === "E");
    if (coarse.length < 2) return 0;
    const [a, b] = coarse.map((item) => map.latLngToContainerPoint([item.lat[2], item.lon[2]]));
    return a.distanceTo(b);
  }

  // A wide pale band under the part of the line that the profile has in view.
  const inView = L.polyline([], { color: "#1c2733", weight: 30, opacity: 0.13, lineCap: "butt", interactive: false });

  // One multi-part line for each class, not one object for each step: a long corridor stays quick.
  function drawLine(mode) {
    layers.line.clearLayers();
    inView.addTo(layers.line);
    const whole = L.polyline(points, { color: "#1c2733", weight: LINE_WIDTH + 4, lineCap: "butt", interactive: false });
    const paper = L.polyline(points, { color: "#ffffff", weight: LINE_WIDTH + 2, lineCap: "butt", interactive: false });
    whole.addTo(layers.line);
    paper.addTo(layers.line);
    const parts = mode.classes.map(() => []);
    runs(mode).forEach((run) => parts[run.of].push(stretch(run.from, run.to)));
    parts.forEach((part, i) => {
      if (part.length) L.polyline(part, { color: mode.classes[i].color, weight: LINE_WIDTH, lineCap: "butt", interactive: false }).addTo(layers.line);
    });
  }

  // Neighboring steps of one class, as { of, from, to }.
  function runs(mode) {
    const found = [];
    data.steps.from.forEach((from, step) => {
      const of = mode.step(step);
      const last = found[found.length - 1];
      if (last && last.of === of) last.to = data.steps.to[step];
      else found.push({ of, from, to: data.steps.to[step] });
    });
    return found;
  }

  const marks = borings.map((point, i) => {
    if (!point) return null;
    const style = data.borings.used[i] === 1
      ? { radius: 5, color: "#1c2733", weight: 2, fillColor: "#ffffff", fillOpacity: 1 }
      : { radius: 4.5, color: "#5b6670", weight: 1.5, dashArray: "2 2.5", fillColor: "#ffffff", fillOpacity: 0.6 };
    return L.circleMarker(point, { ...style, interactive: false }).addTo(layers.borings);
  });

  // Where borings would cover the line at a small scale they shrink, and at last go: the names stay.
  function sizeBorings() {
    const metersPerPixel = map.distance(map.containerPointToLatLng([0, 100]), map.containerPointToLatLng([100, 100])) / 100;
    const crowd = (data.length / Math.max(borings.length, 1)) / metersPerPixel;
    const radius = crowd < 3 ? 0 : crowd < 7 ? 2 : crowd < 16 ? 3.5 : 5;
    marks.forEach((mark, i) => {
      if (!mark) return;
      const isOpen = i === place.boring();
      mark.setRadius(isOpen ? 8 : radius);
      mark.setStyle({ stroke: isOpen || radius > 0 });
    });
  }

  const metric = data.corridor.unit.name === "m";
  L.control.scale({ metric, imperial: !metric, maxWidth: 130 }).addTo(map);

  const cursor = L.marker(points[0], {
    icon: L.divIcon({ className: "plan-cursor", iconSize: [22, 22] }),
    interactive: false,
    keyboard: false,
    opacity: 0,
  }).addTo(map);
  const refreshGrid = drawGrid();
  const labels = makePlanLabels(map, { data, chainage, pointAt, borings, place, runs });

  function nearestBoring(point, reach) {
    let best = reach * reach;
    let found = null;
    borings.forEach((latLng, i) => {
      if (!latLng) return;
      const d = map.latLngToContainerPoint(latLng);
      const square = (d.x - point.x) ** 2 + (d.y - point.y) ** 2;
      if (square < best) [best, found] = [square, i];
    });
    return found;
  }

  // Projected once for each zoom; a pointer move then costs one pass over plain numbers.
  let projected = null;
  function project() {
    const zoom = map.getZoom();
    if (projected && projected.zoom === zoom) return projected;
    const pixels = points.map((point) => map.project(point, zoom));
    projected = { zoom, x: pixels.map((p) => p.x), y: pixels.map((p) => p.y) };
    return projected;
  }

  function nearestDistance(latLng, reach) {
    const { zoom, x, y } = project();
    const p = map.project(latLng, zoom);
    let best = reach * reach;
    let found = null;
    for (let i = 0; i + 1 < x.length; i += 1) {
      const dx = x[i + 1] - x[i];
      const dy = y[i + 1] - y[i];
      const square = dx * dx + dy * dy;
      const share = square ? Math.min(Math.max(((p.x - x[i]) * dx + (p.y - y[i]) * dy) / square, 0), 1) : 0;
      const away = (p.x - x[i] - share * dx) ** 2 + (p.y - y[i] - share * dy) ** 2;
      if (away < best) [best, found] = [away, at[i] + share * (at[i + 1] - at[i])];
    }
    return found;
  }

  map.on("mousemove", (event) => {
    const boring = nearestBoring(event.containerPoint, HIT_BORING);
    map.getContainer().classList.toggle("over-boring", boring !== null);
    const distance = nearestDistance(event.latlng, HIT_LINE);
    if (distance === null) place.leave("plan");
    else place.preview(distance, null, "plan");
  });
  map.on("mouseout", () => place.leave("plan"));
  map.on("click", (event) => {
    const boring = nearestBoring(event.containerPoint, HIT_BORING + 4);
    if (boring !== null) return place.openBoring(boring, "plan");
    const distance = nearestDistance(event.latlng, HIT_LINE + 14);
    if (distance !== null) place.hold(distance, null, "plan");
    return undefined;
  });

  place.onChange((state) => {
    const shown = state.place;
    cursor.setOpacity(shown ? 1 : 0);
    const node = cursor.getElement();
    if (shown) {
      cursor.setLatLng(pointAt(shown.distance));
      node.dataset.distance = shown.distance.toFixed(2);
    } else delete node.dataset.distance;
    marks.forEach((mark, i) => mark && mark.setStyle(i === state.boring ? { fillColor: "#c4006a" } : { fillColor: "#ffffff" }));
    sizeBorings();
    if (state.boring !== named) relabel();
    named = state.boring;
  });

  let named = null;
  let mode = colors.modes.group;
  function refresh() {
    sizeBorings();
    refreshGrid();
    labels.place(mode);
  }
  const relabel = oncePerFrame(refresh);
  map.on("zoomend moveend", relabel);
  map.on("move", labels.frame);

  const leastZoom = map.getMinZoom();
  // Until the reader moves the plan it keeps showing the whole line, whatever room it is given.
  let moved = false;
  map.on("dragstart", () => { moved = true; });
  map.getContainer().addEventListener("wheel", () => { moved = true; });
  map.getContainer().addEventListener("click", () => { moved = true; });
  // Clear of the buttons on the right, the scale and the signs below.
  const fit = () => {
    map.setMinZoom(leastZoom);
    map.fitBounds(bounds, { animate: false, paddingTopLeft: [40, 22], paddingBottomRight: [60, 40] });
    map.setMinZoom(Math.max(map.getZoom() - 1, leastZoom)); // farther out the grid would end
  };
  let screen = null; // what the screen showed when printing began
  const pan = (point) => {
    moved = true;
    map.panTo(point, { animate: !still });
  };

  return {
    color(next) {
      mode = next;
      drawLine(mode);
      layers.borings.bringToFront();
      relabel();
    },
    showWhole() {
      moved = false;
      fit();
    },
    showInView(from, to) {
      inView.setLatLngs(to - from < data.length - 1e-6 ? stretch(from, to) : []);
    },
    panTo: (distance) => pan(pointAt(distance)),
    panToBoring: (number) => borings[number] && pan(borings[number]),
    resize() {
      map.invalidateSize({ animate: false });
      if (!moved) fit();
    },
    // On the sheet the plan shows what the reader has in view, drawn before the call returns.
    fitSheet() {
      screen = screen || { center: map.getCenter(), zoom: map.getZoom(), bounds: map.getBounds() };
      map.invalidateSize({ animate: false });
      if (moved) map.fitBounds(screen.bounds, { animate: false });
      else fit();
      refresh();
      map.getRenderer(inView)._redraw();
    },
    leaveSheet() {
      map.invalidateSize({ animate: false });
      if (moved) map.setView(screen.center, screen.zoom, { animate: false });
      else fit();
      screen = null;
      refresh();
    },
  };
}
