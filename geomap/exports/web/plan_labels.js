// Labels of the plan: pegs, borings, groups along the line, and the grid values at the frame. A label that
// would touch another is not drawn; it appears when there is room, after zooming in.

const LABEL_LIMIT = 120;
const PEG_PIXELS = 84;

function makePlanLabels(map, { data, chainage, pointAt, borings, place, runs }) {
  const group = L.layerGroup().addTo(map);
  const frame = element("div", { class: "plan-frame", "aria-hidden": "true" });
  map.getContainer().append(frame);
  const ruler = document.createElement("canvas").getContext("2d");

  const widthOf = (text, font) => {
    ruler.font = font;
    return ruler.measureText(text).width;
  };

  function metersPerPixel() {
    const middle = map.getSize().divideBy(2);
    return map.distance(map.containerPointToLatLng(middle), map.containerPointToLatLng([middle.x + 100, middle.y])) / 100;
  }

  // The direction square to the line on the screen, so that labels stand beside it and not on it.
  function square(distance) {
    const reach = 8 * metersPerPixel(); // far enough that rounding to pixels cannot turn it
    const a = map.latLngToContainerPoint(pointAt(Math.max(distance - reach, 0)));
    const b = map.latLngToContainerPoint(pointAt(Math.min(distance + reach, data.length)));
    const length = a.distanceTo(b) || 1;
    return { x: -(b.y - a.y) / length, y: (b.x - a.x) / length };
  }

  // Where the line and the borings run on the screen, as a coarse raster: no label may stand there.
  const CELL = 6;
  let occupied = new Set();

  function occupy(x, y, reach) {
    for (const dx of [-reach, 0, reach]) for (const dy of [-reach, 0, reach]) occupied.add(Math.floor((x + dx) / CELL) * 10000 + Math.floor((y + dy) / CELL));
  }

  function occupyLine() {
    occupied = new Set();
    const size = map.getSize();
    const step = Math.max(5 * metersPerPixel(), data.length / 20000);
    for (let distance = 0; distance <= data.length; distance += step) {
      const at = map.latLngToContainerPoint(pointAt(distance));
      if (at.x > -20 && at.y > -20 && at.x < size.x + 20 && at.y < size.y + 20) occupy(at.x, at.y, 5);
    }
    for (const boring of borings) {
      if (!boring) continue;
      const at = map.latLngToContainerPoint(boring);
      occupy(at.x, at.y, 4);
    }
  }

  function touchesLine(box) {
    for (let x = Math.floor(box[0] / CELL); x <= Math.floor(box[2] / CELL); x += 1) {
      for (let y = Math.floor((box[1] + 2) / CELL); y <= Math.floor((box[3] - 2) / CELL); y += 1) if (occupied.has(x * 10000 + y)) return true;
    }
    return false;
  }

  const taken = [];
  function isFree(box) {
    const size = map.getSize();
    if (box[0] < 2 || box[1] < 2 || box[2] > size.x - 2 || box[3] > size.y - 2) return false;
    if (touchesLine(box)) return false;
    return taken.every((other) => box[2] < other[0] || box[0] > other[2] || box[3] < other[1] || box[1] > other[3]);
  }

  function put(latLng, dx, dy, text, kind, font) {
    const point = map.latLngToContainerPoint(latLng);
    const width = Math.min(widthOf(text, font) + 8, 150);
    const left = point.x + dx - (dx < -4 ? width : dx > 4 ? 0 : width / 2);
    const top = point.y + dy - 8;
    const box = [left, top, left + width, top + 16];
    if (taken.length > LABEL_LIMIT || !isFree(box)) return false;
    taken.push(box);
    const node = element("div", { class: `plan-label ${kind}` }, isolated(text));
    const icon = L.divIcon({ className: "plan-anchor", html: node, iconSize: [width, 16], iconAnchor: [point.x - left, point.y - top] });
    L.marker(latLng, { icon, interactive: false, keyboard: false }).addTo(group);
    return true;
  }

  function pegs() {
    const spacing = chainage.spacing(metersPerPixel() * PEG_PIXELS);
    const view = map.getBounds();
    for (const peg of chainage.ticks(0, data.length, spacing)) {
      const point = pointAt(peg.distance);
      if (!view.contains(point)) continue;
      const side = square(peg.distance);
      // Always on the upper side of the line: pegs then read as one row.
      const up = side.y < 0 || (side.y === 0 && side.x > 0) ? side : { x: -side.x, y: -side.y };
      const drawn = put(point, up.x * 24, up.y * 24, peg.text, "peg", `600 11px ${FONT}`);
      if (drawn) {
        const angle = Math.atan2(up.y, up.x);
        const tick = element("div", { class: "peg-tick" });
        tick.style.transform = `rotate(${angle}rad)`;
        L.marker(point, { icon: L.divIcon({ className: "plan-anchor", html: tick, iconSize: [0, 0] }), interactive: false, keyboard: false }).addTo(group);
      }
    }
  }

  function names(order) {
    const view = map.getBounds();
    for (const i of order) {
      if (!borings[i] || !view.contains(borings[i])) continue;
      const kind = data.borings.used[i] === 1 ? "boring" : "boring left-out";
      const text = shortened(data.borings.name[i], 16);
      [[10, 10], [10, -10], [-10, 10], [-10, -10], [14, 0], [-14, 0], [0, 19], [0, -19]].some(([dx, dy]) => put(borings[i], dx, dy, text, kind, `11px ${FONT}`));
    }
  }

  // Letters along the line: the colors are then never the only sign.
  function letters(mode) {
    const scale = metersPerPixel();
    for (const run of runs(mode)) {
      const item = mode.classes[run.of];
      if ((run.to - run.from) / scale < 34) continue;
      const middle = (run.from + run.to) / 2;
      const side = square(middle);
      const down = side.y > 0 || (side.y === 0 && side.x < 0) ? side : { x: -side.x, y: -side.y };
      put(pointAt(middle), down.x * 20, down.y * 20, item.symbol || item.name, "letter", `700 11px ${FONT}`);
    }
  }

  // Grid values ride on the lower and the left edge of the frame, where a plan sheet carries them.
  function drawFrame() {
    const size = map.getSize();
    const marks = [];
    const last = { E: -1e9, N: -1e9 };
    for (const line of data.plan.grid) {
      if (!line.coarse) continue;
      const ends = line.lat.map((y, i) => map.latLngToContainerPoint([y, line.lon[i]]));
      const at = crossing(ends, line.axis, size);
      if (at === null || Math.abs(at - last[line.axis]) < (line.axis === "E" ? 96 : 26)) continue;
      last[line.axis] = at;
      const label = element("span", { class: `grid-label grid-${line.axis}` }, `${line.axis} ${grouped(line.value, " ")}`);
      label.style[line.axis === "E" ? "left" : "top"] = `${at}px`;
      marks.push(label);
    }
    frame.replaceChildren(...marks);
  }

  function crossing(ends, axis, size) {
    const [along, across, edge, limit] = axis === "E" ? ["x", "y", size.y, size.x] : ["y", "x", 0, size.y];
    for (let i = 0; i + 1 < ends.length; i += 1) {
      const a = ends[i];
      const b = ends[i + 1];
      if ((a[across] - edge) * (b[across] - edge) > 0 || a[across] === b[across]) continue;
      const at = a[along] + ((b[along] - a[along]) * (edge - a[across])) / (b[across] - a[across]);
      return at > 60 && at < limit - (axis === "N" ? 66 : 40) ? at : null; // the scale bar stands in the corner
    }
    return null;
  }

  return {
    frame: drawFrame,
    place(mode) {
      group.clearLayers();
      taken.length = 0;
      // Corner furniture keeps its room: north arrow and zoom buttons, scale bar, signs.
      const size = map.getSize();
      taken.push([size.x - 56, 0, size.x, 120], [0, size.y - 50, 170, size.y], [size.x - 170, size.y - 40, size.x, size.y]);
      occupyLine();
      // The open boring is named before anything else; then what every reader needs first.
      const open = place.boring();
      if (open !== null) names([open]);
      pegs();
      letters(mode);
      names(borings.map((_, i) => i).filter((i) => i !== open));
      drawFrame();
    },
  };
}
