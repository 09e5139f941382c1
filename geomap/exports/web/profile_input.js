// Pointer, wheel, fingers and keys on the profile and on the strip beneath it.

const CLICK_PIXELS = 4;

function listenToProfile(nodes, profile, data, plan, place) {
  const { canvas, overviewCanvas } = nodes;
  const { scale } = profile;
  const fingers = new Map();
  let drag = null;

  const pixel = (event, node) => {
    const box = node.getBoundingClientRect();
    return { x: event.clientX - box.left, y: event.clientY - box.top };
  };

  function preview({ x, y }) {
    if (x < scale.left || x > scale.right) return place.leave("profile");
    const distance = scale.distance(x);
    place.preview(distance, scale.depthAt(distance, y), "profile");
    canvas.classList.toggle("over-boring", profile.boringAt(x, y) !== null);
    return undefined;
  }

  function click({ x, y }) {
    if (x < scale.left || x > scale.right) return;
    const boring = profile.boringAt(x, y);
    const distance = scale.distance(x);
    if (boring !== null) {
      place.openBoring(boring, "profile");
      plan.panToBoring(boring);
    } else {
      place.hold(distance, scale.depthAt(distance, y), "profile");
      plan.panTo(distance);
    }
  }

  canvas.addEventListener("pointerdown", (event) => {
    if (event.button !== 0) return;
    canvas.setPointerCapture(event.pointerId);
    const at = pixel(event, canvas);
    fingers.set(event.pointerId, at);
    // Shift and drag chooses a stretch to look at; a plain drag moves along the line.
    drag = { at, from: scale.from, to: scale.to, chooses: event.shiftKey, spread: spread() };
  });

  function spread() {
    const [a, b] = [...fingers.values()];
    return b ? { width: Math.max(Math.abs(a.x - b.x), 20), middle: (a.x + b.x) / 2 } : null;
  }

  canvas.addEventListener("pointermove", (event) => {
    const at = pixel(event, canvas);
    if (!drag) return preview(at);
    fingers.set(event.pointerId, at);
    const now = spread();
    const perPixel = (drag.to - drag.from) / (scale.right - scale.left);
    if (now && drag.spread) {
      const width = ((drag.to - drag.from) * drag.spread.width) / now.width;
      const centre = drag.from + (drag.spread.middle - scale.left) * perPixel;
      const share = (now.middle - scale.left) / (scale.right - scale.left);
      profile.show(centre - share * width, centre + (1 - share) * width);
    } else if (drag.chooses) place.preview(scale.distance(at.x), null, "profile");
    else if (Math.abs(at.x - drag.at.x) > CLICK_PIXELS) {
      const moved = (drag.at.x - at.x) * perPixel;
      profile.show(drag.from + moved, drag.to + moved);
    }
    return undefined;
  });

  function release(event) {
    const at = pixel(event, canvas);
    fingers.delete(event.pointerId);
    if (!drag) return;
    const moved = Math.hypot(at.x - drag.at.x, at.y - drag.at.y);
    if (event.type === "pointerup" && !drag.spread) {
      if (moved <= CLICK_PIXELS) click(at);
      else if (drag.chooses) {
        const ends = [scale.distance(drag.at.x), scale.distance(at.x)].sort((a, b) => a - b);
        profile.show(ends[0], ends[1]);
      }
    }
    if (!fingers.size) drag = null;
  }
  canvas.addEventListener("pointerup", release);
  canvas.addEventListener("pointercancel", release);
  canvas.addEventListener("pointerleave", () => place.leave("profile"));
  canvas.addEventListener("dblclick", (event) => profile.zoom(0.5, scale.distance(pixel(event, canvas).x)));
  canvas.addEventListener(
    "wheel",
    (event) => {
      // At the whole line, turning back belongs to the page: it scrolls on instead of sticking here.
      if (event.deltaY > 0 && scale.to - scale.from >= data.length - 1e-6) return;
      event.preventDefault();
      profile.zoom(event.deltaY > 0 ? 1.25 : 0.8, scale.distance(pixel(event, canvas).x));
    },
    { passive: false },
  );

  const keys = {
    ArrowLeft: (event) => walk(event.shiftKey ? -10 : -1),
    ArrowRight: (event) => walk(event.shiftKey ? 10 : 1),
    ArrowUp: () => dig(-1),
    ArrowDown: () => dig(1),
    Home: () => go(0),
    End: () => go(data.length),
    PageUp: () => nextBoring(-1),
    PageDown: () => nextBoring(1),
    "+": () => profile.zoom(0.5, place.current()?.distance),
    "=": () => profile.zoom(0.5, place.current()?.distance),
    "-": () => profile.zoom(2, place.current()?.distance),
    Escape: () => place.clear("keys"),
  };

  function go(distance, depth = null) {
    place.hold(distance, depth, "keys");
    profile.panTo(distance);
    plan.panTo(distance);
  }

  // A key moves by whole steps and stands in the middle of one, where the answer is meant.
  function walk(count) {
    const now = place.current();
    const { from, to } = data.steps;
    const step = now ? Math.min(Math.max(data.stepAt(now.distance) + count, 0), from.length - 1) : data.stepAt(scale.from);
    go((from[step] + to[step]) / 2, now ? now.depth : null);
  }

  function dig(count) {
    const now = place.current() || { distance: (scale.from + scale.to) / 2, depth: null };
    const layer = now.depth === null ? data.formationLayer(now.distance) : data.layerAt(now.depth);
    const next = Math.min(Math.max(layer + count, 0), data.layers - 1);
    go(now.distance, (data.cells.tops[next] + data.cells.bases[next]) / 2);
  }

  function nextBoring(direction) {
    const now = place.current() ? place.current().distance : scale.from - 1e-6;
    const order = data.borings.distance.map((distance, number) => ({ distance, number })).filter((hole) => hole.distance !== null);
    order.sort((a, b) => direction * (a.distance - b.distance));
    const next = order.find((hole) => direction * (hole.distance - now) > 0.01);
    if (!next) return;
    place.openBoring(next.number, "keys");
    profile.panTo(next.distance);
    plan.panToBoring(next.number);
  }

  canvas.addEventListener("keydown", (event) => {
    const act = keys[event.key];
    if (!act || event.ctrlKey || event.metaKey || event.altKey) return;
    event.preventDefault();
    act(event);
  });

  listenToOverview(overviewCanvas, profile, data);
}

// The strip takes one gesture: press or drag, and the profile moves there.
function listenToOverview(canvas, profile, data) {
  const { scale, overview } = profile;
  const move = (event) => {
    const at = overview.distance(event.clientX - canvas.getBoundingClientRect().left);
    const half = Math.min((scale.to - scale.from) / 2, data.length / 2);
    profile.show(at - half, at + half);
  };
  canvas.addEventListener("pointerdown", (event) => {
    canvas.setPointerCapture(event.pointerId);
    move(event);
  });
  canvas.addEventListener("pointermove", (event) => event.buttons && move(event));
}
