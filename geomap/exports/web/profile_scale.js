// Where things stand in the profile: the visible stretch, the visible levels, and the pixels for both.

const LEAST_STRETCH = 40; // meters: closer than this there is nothing more to see
const BAND_HEIGHT = 17;
const NARROW = 520; // pixels
const MOST_EXAGGERATION = 100; // on a narrow screen, to begin with: steeper than that the ground is a picket fence

// Paper has finer points than most screens.
function pixelRatio() {
  const ratio = window.devicePixelRatio || 1;
  return document.documentElement.classList.contains("printing") ? Math.max(ratio, 2) : ratio;
}

function makeProfileScale(data) {
  const { cells, borings } = data;
  const groundOf = (column) => cells.ground[column] ?? 0;
  const scale = { from: 0, to: data.length, byDepth: false, width: 0, height: 0 };

  scale.resize = (width, height) => {
    scale.width = width;
    scale.height = height;
    const narrow = width < NARROW;
    scale.bands = data.hasFormation ? ["cutFill", "suitability", "evidence"] : ["evidence"];
    scale.nameRows = narrow ? 2 : 3;
    scale.left = narrow ? 62 : 74;
    scale.right = width - 14;
    scale.top = 8;
    scale.bottom = height - 24 - scale.bands.length * BAND_HEIGHT - 4;
  };

  // A level as it is plotted: above the datum, or relative to the ground above it.
  scale.plotted = (level, distance) => (scale.byDepth ? level - (data.groundAt(distance) ?? 0) : level);
  scale.topOf = (column) => (scale.byDepth ? 0 : groundOf(column));
  scale.boringTop = (number) => (scale.byDepth ? 0 : (borings.ground[number] ?? data.groundAt(borings.distance[number]) ?? 0));

  // Levels follow the visible stretch: hills far away must not flatten the soil in view.
  scale.fitLevels = () => {
    let low = Infinity;
    let high = -Infinity;
    const include = (level) => {
      if (level === null || !Number.isFinite(level)) return;
      low = Math.min(low, level);
      high = Math.max(high, level);
    };
    const first = data.columnAt(scale.from);
    const last = data.columnAt(scale.to);
    for (let column = first; column <= last && column < cells.from.length; column += 1) {
      include(scale.topOf(column));
      include(scale.topOf(column) - data.columnBase[column]);
    }
    data.ground.distance.forEach((distance, i) => {
      if (distance < scale.from || distance > scale.to || data.ground.formation[i] === null) return;
      const formation = scale.plotted(data.ground.formation[i], distance);
      include(formation);
      if (data.corridor.zoneDepth) include(formation - data.corridor.zoneDepth);
    });
    borings.distance.forEach((distance, i) => {
      if (distance === null || distance < scale.from || distance > scale.to || borings.used[i] !== 1) return;
      include(scale.boringTop(i));
      include(scale.boringTop(i) - (borings.depth[i] || 0));
    });
    if (low > high) [low, high] = [0, 1];
    const air = Math.max((high - low) * 0.05, 0.2);
    scale.low = low - air;
    scale.high = high + air;
  };

  scale.show = (from, to) => {
    const width = Math.min(Math.max(to - from, Math.min(LEAST_STRETCH, data.length)), data.length);
    const start = Math.min(Math.max((from + to - width) / 2, 0), data.length - width);
    scale.from = start;
    scale.to = start + width;
    scale.fitLevels();
  };

  scale.x = (distance) => scale.left + ((distance - scale.from) / (scale.to - scale.from)) * (scale.right - scale.left);
  scale.y = (level) => scale.top + ((scale.high - level) / (scale.high - scale.low)) * (scale.bottom - scale.top);
  scale.distance = (x) => scale.from + ((x - scale.left) / (scale.right - scale.left)) * (scale.to - scale.from);
  scale.level = (y) => scale.high - ((y - scale.top) / (scale.bottom - scale.top)) * (scale.high - scale.low);
  scale.metersPerPixel = () => (scale.to - scale.from) / (scale.right - scale.left);
  scale.exaggeration = () => (scale.metersPerPixel() * (scale.bottom - scale.top)) / (scale.high - scale.low);

  // Depth below ground under a pixel, or null above the ground and below the deepest cell.
  scale.depthAt = (distance, y) => {
    if (y < scale.top || y > scale.bottom) return null;
    const column = data.columnAt(distance);
    const depth = scale.topOf(column) - scale.level(y);
    return depth < 0 || depth > data.columnBase[column] ? null : depth;
  };
  scale.bandTop = (row) => scale.bottom + 4 + row * BAND_HEIGHT;
  return scale;
}

// How much of the line a narrow profile begins with: all of it where that is not too steep.
function firstStretch(canvas, scale) {
  const whole = scale.to;
  scale.resize(canvas.clientWidth, canvas.clientHeight);
  scale.show(0, whole);
  for (let to = whole; scale.width <= NARROW && scale.exaggeration() > MOST_EXAGGERATION && to > 4 * LEAST_STRETCH; to *= 0.8) scale.show(0, to);
  return scale.to;
}
