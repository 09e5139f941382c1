// The place that the reader looks at: one distance along the line, shared by plan, profile and cards.
//
// A pointer previews a place, a click or a key holds it. When the pointer leaves, the held place comes back, so
// that reading a card on the right does not change it on the way there.

function makePlace(data) {
  const listeners = [];
  let preview = null;
  let held = null;
  let boring = null;
  let last = "";

  const inside = (distance) => Math.min(Math.max(distance, 0), data.length);

  // Many pointer events arrive in one frame; the page is redrawn once for all of them.
  const tellAll = oncePerFrame(() => listeners.forEach((listener) => listener({ place: preview || held, held, boring, source: last })));
  function tell(source) {
    last = source;
    tellAll();
  }

  return {
    onChange: (listener) => listeners.push(listener),
    current: () => preview || held,
    held: () => held,
    boring: () => boring,
    // `depth` is meters below ground; null means: at formation.
    preview(distance, depth, source) {
      preview = { distance: inside(distance), depth };
      tell(source);
    },
    leave(source) {
      if (preview === null) return;
      preview = null;
      tell(source);
    },
    // Whoever asks for a place wants its stretch: an open boring card would stand above it.
    hold(distance, depth, source) {
      held = { distance: inside(distance), depth };
      preview = null;
      boring = null;
      tell(source);
    },
    openBoring(number, source) {
      boring = number;
      const distance = data.borings.distance[number];
      if (distance !== null) held = { distance: inside(distance), depth: null };
      preview = null;
      tell(source);
    },
    closeBoring(source) {
      boring = null;
      tell(source);
    },
    clear(source) {
      held = null;
      preview = null;
      boring = null;
      tell(source);
    },
  };
}
