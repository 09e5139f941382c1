// The cells of the profile: color for the class, paleness for doubt, hatch where the class is likelier than not,
// letters where there is room for them.

const HATCHED_FROM = 50; // percent
const LETTER_PIXELS = 112; // from one letter to the next along the line

function makeCellPainter(context, data, scale) {
  const { cells } = data;

  // Columns in view as pixel spans; where several fall on one pixel the first stands for them.
  function visibleColumns() {
    const ratio = window.devicePixelRatio || 1;
    const snap = (x) => Math.round(x * ratio) / ratio;
    const found = [];
    const last = data.columnAt(scale.to);
    for (let column = data.columnAt(scale.from); column <= last; column += 1) {
      const left = snap(scale.x(cells.from[column]));
      const right = snap(scale.x(cells.to[column]));
      if (right > left) found.push({ column, left, right });
    }
    return found;
  }

  // Layers of one column that look alike, joined: fewer, taller rectangles.
  function stacks(column, lookOf) {
    const found = [];
    const top = scale.topOf(column);
    for (let layer = 0; layer < data.layers && cells.tops[layer] < data.columnBase[column]; layer += 1) {
      const look = lookOf(data.cellAt(column, layer));
      const last = found[found.length - 1];
      const bottom = scale.y(top - cells.bases[layer]);
      if (last && last.look === look) last.bottom = bottom;
      else found.push({ look, top: scale.y(top - cells.tops[layer]), bottom });
    }
    return found;
  }

  const patterns = new Map();
  function patternOf(item) {
    const key = `${item.hatch}${item.text}${window.devicePixelRatio}`;
    if (!patterns.has(key)) {
      patterns.set(key, hatchPattern(context, item.hatch, 16, item.text === "#ffffff" ? "rgba(255,255,255,0.42)" : "rgba(0,0,0,0.34)"));
    }
    return patterns.get(key);
  }

  function paint(mode) {
    const columns = visibleColumns();
    const hatched = mode.classes.map(() => null);
    for (const { column, left, right } of columns) {
      for (const stack of stacks(column, mode.shade)) {
        context.fillStyle = stack.look;
        context.fillRect(left, stack.top, right - left, stack.bottom - stack.top + 0.5);
      }
      const sure = (cell) => (mode.strength && mode.strength(cell) < HATCHED_FROM ? -1 : mode.cell(cell));
      for (const stack of stacks(column, sure)) {
        if (stack.look < 0 || !mode.classes[stack.look].hatch) continue;
        hatched[stack.look] = hatched[stack.look] || new Path2D();
        hatched[stack.look].rect(left, stack.top, right - left, stack.bottom - stack.top);
      }
    }
    hatched.forEach((path, i) => {
      if (!path) return;
      context.fillStyle = patternOf(mode.classes[i]);
      context.fill(path);
    });
    return columns;
  }

  // A letter goes where a run of one class is tall enough here and still there half a word to each side.
  function letters(mode, isTaken) {
    context.font = `700 12px ${FONT}`;
    context.textAlign = "center";
    context.textBaseline = "middle";
    const count = Math.max(Math.floor((scale.right - scale.left) / LETTER_PIXELS), 1);
    let last = -1e9;
    for (let k = 0; k < count; k += 1) {
      const middle = scale.left + ((k + 0.5) * (scale.right - scale.left)) / count;
      const x = [0, 20, -20, 40, -40, 60, -60].map((shift) => middle + shift).find((at) => !isTaken(at) && at - last > 64 && at > scale.left + 26 && at < scale.right - 26);
      if (x === undefined) continue;
      lettersAt(mode, x);
      last = x;
    }
  }

  function lettersAt(mode, x) {
    const column = data.columnAt(scale.distance(x));
    for (const stack of stacks(column, mode.cell)) {
      const item = mode.classes[stack.look];
      const text = item.symbol || item.name;
      const half = context.measureText(text).width / 2 + 3;
      const y = (stack.top + stack.bottom) / 2;
      if (stack.bottom - stack.top < 15 || y < scale.top + 8 || y > scale.bottom - 8) continue;
      if (![-half, half].every((shift) => classAt(mode, x + shift, y) === stack.look)) continue;
      letter(text, x, y);
    }
  }

  function letter(text, x, y) {
    context.lineJoin = "round";
    context.lineWidth = 3.5;
    context.strokeStyle = "rgba(255,255,255,0.92)";
    context.strokeText(text, x, y);
    context.fillStyle = "#1c2733";
    context.fillText(text, x, y);
  }

  function classAt(mode, x, y) {
    const distance = scale.distance(x);
    const depth = scale.depthAt(distance, y);
    return depth === null ? -1 : mode.cell(data.cellAt(data.columnAt(distance), data.layerAt(depth)));
  }

  return { paint, letters, letter, patternOf };
}
