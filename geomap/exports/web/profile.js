// The profile as a whole: draws its parts in order, keeps the visible stretch, and marks the place looked at.

function makeProfile(nodes, data, colors, chainage, lengths, place) {
  const { canvas, cursorCanvas, overviewCanvas, exaggeration, part } = nodes;
  const context = canvas.getContext("2d");
  const over = cursorCanvas.getContext("2d");
  const scale = makeProfileScale(data);
  const cellPainter = makeCellPainter(context, data, scale);
  const marks = makeProfileMarks(context, data, scale, colors, chainage, lengths, cellPainter);
  const bands = makeBands(context, data, scale, colors, lengths, cellPainter);
  const overview = makeOverview(overviewCanvas, data, colors, scale);
  let mode = colors.modes.group;
  let holes = [];
  let drawn = false;
  let onView = () => {};

  function clip(draw) {
    context.save();
    context.beginPath();
    context.rect(scale.left, scale.top, scale.right - scale.left, scale.bottom - scale.top);
    context.clip();
    draw();
    context.restore();
  }

  function draw() {
    const ratio = pixelRatio();
    scale.resize(canvas.clientWidth, canvas.clientHeight);
    scale.top = 10 + marks.placeNames(place.boring()) * NAME_ROW;
    scale.show(scale.from, scale.to);
    for (const each of [canvas, cursorCanvas]) {
      each.width = Math.round(scale.width * ratio);
      each.height = Math.round(scale.height * ratio);
    }
    context.setTransform(ratio, 0, 0, ratio, 0, 0);
    over.setTransform(ratio, 0, 0, ratio, 0, 0);
    context.fillStyle = "#ffffff";
    context.fillRect(0, 0, scale.width, scale.height);
    clip(() => {
      marks.embankment();
      cellPainter.paint(mode);
      marks.lines();
    });
    clip(() => {
      // Clear of the columns and of the sample letters to their right.
      const taken = marks.fittedBorings().map((hole) => [hole.x - 34, hole.x + (hole.lettersFit ? 80 : 34)]);
      cellPainter.letters(mode, (x) => taken.some(([left, right]) => x > left && x < right));
    });
    marks.axes();
    marks.pegs();
    bands.paint();
    marks.drawNames(place.boring());
    clip(() => {
      holes = marks.boringColumns(place.boring());
    });
    onView(scale.from, scale.to);
    overview.draw(colors.modes.suitability.step && data.hasFormation ? colors.modes.suitability : mode);
    exaggeration.textContent = `Vertical exaggeration ${scale.exaggeration().toFixed(scale.exaggeration() < 10 ? 1 : 0)}`;
    // On a phone the profile begins with a part of the line, which must be said.
    part.hidden = scale.width > NARROW || scale.to - scale.from >= data.length - 1e-6;
    part.textContent = `${chainage.text(scale.from, 0)} to ${chainage.text(scale.to, 0)} of ${lengths.long(data.length)}: drag for more`;
    drawn = true;
    drawCursor();
  }

  // The vertical line, its peg label and the cell under it; held places keep a heavier line.
  function drawCursor() {
    if (!drawn) return;
    over.clearRect(0, 0, scale.width, scale.height);
    const held = place.held();
    const shown = place.current();
    if (held && held !== shown) cursorLine(held, 1, "rgba(196,0,106,0.55)");
    if (shown) {
      cursorLine(shown, 1.5, "#c4006a");
      cursorCell(shown);
      cursorLabel(shown);
    }
  }

  function cursorLine({ distance }, width, color) {
    const x = scale.x(distance);
    if (x < scale.left - 1 || x > scale.right + 1) return;
    over.strokeStyle = color;
    over.lineWidth = width;
    over.beginPath();
    over.moveTo(x, scale.top - 2);
    over.lineTo(x, scale.bandTop(scale.bands.length));
    over.stroke();
  }

  function cursorCell({ distance, depth }) {
    const column = data.columnAt(distance);
    const layer = depth === null ? data.formationLayer(distance) : data.layerAt(depth);
    const left = Math.max(scale.x(data.cells.from[column]), scale.left);
    const right = Math.min(scale.x(data.cells.to[column]), scale.right);
    const top = scale.y(scale.topOf(column) - data.cells.tops[layer]);
    const bottom = scale.y(scale.topOf(column) - data.cells.bases[layer]);
    if (right < left) return;
    over.strokeStyle = "#c4006a";
    over.lineWidth = 2;
    over.strokeRect(left - 1, top - 1, right - left + 2, bottom - top + 2);
  }

  function cursorLabel({ distance }) {
    const x = scale.x(distance);
    if (x < scale.left - 1 || x > scale.right + 1) return;
    const text = chainage.text(distance);
    over.font = `700 12px ${FONT}`;
    const half = over.measureText(text).width / 2 + 6;
    const middle = Math.min(Math.max(x, scale.left + half), scale.right - half);
    const y = scale.bandTop(scale.bands.length) + 1;
    over.fillStyle = "#ffffff"; // clears a peg label beneath, half of which would be hard to read
    over.fillRect(middle - half - 34, y, 2 * half + 68, 19);
    over.fillStyle = "#c4006a";
    over.fillRect(middle - half, y, 2 * half, 19);
    over.fillStyle = "#ffffff";
    over.textAlign = "center";
    over.textBaseline = "middle";
    over.fillText(text, middle, y + 10);
  }

  const redraw = oncePerFrame(draw);

  function show(from, to) {
    scale.show(from, to);
    redraw();
  }

  let openBefore = null;
  place.onChange((state) => {
    if (state.boring !== openBefore) {
      openBefore = state.boring;
      redraw();
    } else drawCursor();
  });

  return {
    scale,
    overview,
    draw,
    redraw,
    show,
    color(next) {
      mode = next;
      redraw();
    },
    byDepth(on) {
      scale.byDepth = on;
      scale.fitLevels();
      redraw();
    },
    zoom(factor, at) {
      const centre = at === undefined ? (scale.from + scale.to) / 2 : at;
      const width = Math.min((scale.to - scale.from) * factor, data.length);
      const share = (centre - scale.from) / (scale.to - scale.from);
      show(centre - share * width, centre + (1 - share) * width);
    },
    onView(listener) {
      onView = listener;
    },
    panTo(distance) {
      const width = scale.to - scale.from;
      if (distance > scale.from + width * 0.04 && distance < scale.to - width * 0.04) return;
      show(distance - width / 2, distance + width / 2);
    },
    boringAt(x, y) {
      if (y > scale.bottom) return null;
      const near = holes.filter((hole) => Math.abs(hole.x - x) <= Math.max(hole.width / 2 + 3, 7));
      near.sort((a, b) => Math.abs(a.x - x) - Math.abs(b.x - x));
      const hole = near.find(({ number }) => y < scale.y(scale.boringTop(number) - data.borings.depth[number]) + 6);
      return hole ? hole.number : null;
    },
  };
}
