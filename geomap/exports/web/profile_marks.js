// What is drawn over the cells: ground, formation, design zone, embankment, borings, axes and the bands below.

const INK = "#1c2733";
const MUTED = "#4d5a66";
const NAME_ROW = 14; // pixels
const FORMATION = "#00693a"; // green is in no soil color

function makeProfileMarks(context, data, scale, colors, chainage, lengths, cellPainter) {
  const { borings, samples, strata } = data;

  function levelPath(values, below = 0) {
    const path = new Path2D();
    let open = false;
    data.ground.distance.forEach((distance, i) => {
      if (values[i] === null) {
        open = false;
        return;
      }
      const x = scale.x(distance);
      const y = scale.y(scale.plotted(values[i], distance) - below);
      if (open) path.lineTo(x, y);
      else path.moveTo(x, y);
      open = true;
    });
    return path;
  }

  function stroke(path, color, width, dash = []) {
    context.setLineDash(dash);
    context.lineJoin = "round";
    context.strokeStyle = "rgba(255,255,255,0.9)";
    context.lineWidth = width + 2.5;
    context.stroke(path);
    context.strokeStyle = color;
    context.lineWidth = width;
    context.stroke(path);
    context.setLineDash([]);
  }

  // Embankment: between the ground and a formation above it.
  function embankment() {
    const { distance, ground, formation } = data.ground;
    context.fillStyle = "#eceee6";
    for (let i = 0; i + 1 < distance.length; i += 1) {
      const parts = [ground[i], ground[i + 1], formation[i], formation[i + 1]];
      if (parts.includes(null) || (formation[i] <= ground[i] && formation[i + 1] <= ground[i + 1])) continue;
      if (distance[i + 1] < scale.from || distance[i] > scale.to) continue;
      const y = (level, k) => scale.y(scale.plotted(level, distance[k]));
      context.beginPath();
      context.moveTo(scale.x(distance[i]), y(ground[i], i));
      context.lineTo(scale.x(distance[i]), y(Math.max(formation[i], ground[i]), i));
      context.lineTo(scale.x(distance[i + 1]) + 0.5, y(Math.max(formation[i + 1], ground[i + 1]), i + 1));
      context.lineTo(scale.x(distance[i + 1]) + 0.5, y(ground[i + 1], i + 1));
      context.fill();
    }
  }

  function lines() {
    if (data.hasFormation) {
      if (data.corridor.zoneDepth) stroke(levelPath(data.ground.formation, data.corridor.zoneDepth), FORMATION, 1.25, [5, 4]);
      stroke(levelPath(data.ground.formation), FORMATION, 2.25);
    }
    stroke(levelPath(data.ground.ground), INK, 1.75);
  }

  // Borings in view with their pixel, from left to right.
  function visibleBorings() {
    return borings.distance
      .map((distance, number) => ({ number, x: distance === null ? NaN : scale.x(distance) }))
      .filter((hole) => hole.x >= scale.left - 6 && hole.x <= scale.right + 6)
      .sort((a, b) => a.x - b.x);
  }

  // How wide each column may be, and whether letters have room beside it.
  function fittedBorings() {
    const holes = visibleBorings();
    holes.forEach((hole, i) => {
      const gap = Math.min(hole.x - (holes[i - 1]?.x ?? -1e9), (holes[i + 1]?.x ?? 1e9) - hole.x);
      const room = (holes[i + 1]?.x ?? 1e9) - hole.x;
      hole.width = gap > 60 ? 11 : gap > 24 ? 8 : gap > 10 ? 5 : gap > 4.5 ? 3 : 0;
      hole.lettersFit = room > 60 && hole.x + 50 < scale.right;
    });
    return holes;
  }

  // Holes that stand shoulder to shoulder would hide the ground: only a tick above it says where each is.
  function boringColumns(open) {
    const holes = fittedBorings();
    for (const hole of holes) {
      const isOpen = hole.number === open;
      if (hole.width || isOpen) boringColumn({ ...hole, width: hole.width || 5 }, isOpen);
      else tick(hole.x, scale.y(scale.boringTop(hole.number)) - 5, hole.x, scale.y(scale.boringTop(hole.number)));
    }
    return holes;
  }

  function boringColumn({ number, x, width, lettersFit }, isOpen) {
    const top = scale.boringTop(number);
    const bottom = top - (borings.depth[number] || 0);
    const used = borings.used[number] === 1;
    const left = Math.round(x - width / 2);
    context.fillStyle = "#ffffff";
    context.globalAlpha = used ? 1 : 0.75;
    context.fillRect(left - 1, scale.y(top), width + 2, scale.y(bottom) - scale.y(top));
    context.globalAlpha = 1;
    if (used) {
      for (const row of data.strataOf[number]) {
        if (strata.group[row] < 0) continue;
        context.fillStyle = shadeOf(data.legend.groups[strata.group[row]].color, 58);
        fillDepths(left, width, top, strata.top[row], strata.base[row]);
      }
    }
    let lastLetter = -1e9;
    for (const row of data.samplesOf[number]) {
      if (samples.top[row] === null || samples.used[row] === 0) continue;
      const base = samples.base[row] ?? samples.top[row];
      context.fillStyle = colors.groupItem(samples.group[row]).color;
      if (used) fillDepths(left, width, top, samples.top[row], base, 3);
      const y = scale.y(top - (samples.top[row] + base) / 2);
      if (used && lettersFit && samples.group[row] >= 0 && y - lastLetter > 12) {
        sampleLetters(data.legend.groups[samples.group[row]].symbol, left + width + 4, y);
        lastLetter = y;
      }
    }
    context.strokeStyle = isOpen ? "#c4006a" : used ? INK : MUTED;
    context.lineWidth = isOpen ? 2.5 : 1;
    context.setLineDash(used ? [] : [3, 3]);
    context.strokeRect(left - 0.5, scale.y(top), width + 1, scale.y(bottom) - scale.y(top));
    context.setLineDash([]);
  }

  function fillDepths(left, width, level, from, to, least = 0) {
    const y = scale.y(level - from);
    context.fillRect(left, y, width, Math.max(scale.y(level - to) - y, least));
  }

  function sampleLetters(text, x, y) {
    context.font = `600 10.5px ${FONT}`;
    context.textAlign = "left";
    context.textBaseline = "middle";
    cellPainter.letter(text, x, y);
  }

  // Names stand in rows above the plot, each with a leader to its hole; one that finds no room in any row is
  // left to the pointer and to a closer view. The open boring chooses first.
  let placed = [];

  function placeNames(open) {
    context.font = `11px ${FONT}`;
    const boxes = Array.from({ length: scale.nameRows }, () => []);
    const sorted = visibleBorings().sort((a, b) => (b.number === open) - (a.number === open) || a.x - b.x);
    placed = [];
    for (const { number, x } of sorted) {
      if (placed.some((other) => Math.abs(other.x - x) < 9)) continue; // two leaders so close read as one
      const text = shortened(borings.name[number], 14);
      const half = context.measureText(text).width / 2 + 4;
      const middle = Math.min(Math.max(x, scale.left + half - 4), scale.right - half + 4);
      const row = boxes.findIndex((box) => box.every(([left, right]) => middle + half < left || middle - half > right));
      if (row < 0) continue;
      boxes[row].push([middle - half, middle + half]);
      placed.push({ number, x, text, middle, row });
    }
    return Math.max(boxes.filter((box) => box.length).length, 1);
  }

  function drawNames(open) {
    context.font = `11px ${FONT}`;
    context.textBaseline = "middle";
    context.textAlign = "center";
    context.lineWidth = 1;
    for (const { number, x, row } of placed) {
      const y = scale.top - 9 - row * NAME_ROW;
      context.strokeStyle = number === open ? "#c4006a" : "#8a949c";
      context.beginPath();
      context.moveTo(x, y + 7);
      context.lineTo(x, scale.y(scale.boringTop(number)));
      context.stroke();
    }
    for (const { number, text, middle, row } of placed) {
      const y = scale.top - 9 - row * NAME_ROW;
      const half = context.measureText(text).width / 2 + 2;
      context.fillStyle = "#ffffff"; // a leader from a higher row ends at the name, it does not cross it
      context.fillRect(middle - half, y - 7, 2 * half, 14);
      context.fillStyle = number === open ? "#a30058" : borings.used[number] === 1 ? INK : MUTED;
      context.fillText(text, middle, y);
    }
  }

  function axes() {
    context.fillStyle = "#ffffff";
    context.fillRect(0, 0, scale.left, scale.height);
    context.fillRect(scale.right, 0, scale.width - scale.right, scale.height);
    context.strokeStyle = "#9aa3aa";
    context.lineWidth = 1;
    context.strokeRect(scale.left - 0.5, scale.top - 0.5, scale.right - scale.left + 1, scale.bottom - scale.top + 1);
    context.fillStyle = MUTED;
    context.font = `11px ${FONT}`;
    context.textAlign = "right";
    context.textBaseline = "middle";
    const spacing = roundSpacing(((scale.high - scale.low) * lengths.perMeter * 34) / (scale.bottom - scale.top)) / lengths.perMeter;
    for (let level = Math.ceil(scale.low / spacing) * spacing; level <= scale.high; level += spacing) {
      const y = Math.round(scale.y(level)) + 0.5;
      context.fillText(lengths.number(scale.byDepth ? Math.abs(level) : level, spacing * lengths.perMeter < 1 ? 1 : 0), scale.left - 8, y);
      tick(scale.left - 5, y, scale.left, y);
    }
    context.textAlign = "left";
    context.fillText(scale.byDepth ? `Depth, ${lengths.name}` : `Level, ${lengths.name}`, 4, scale.top - 10);
  }

  function roundSpacing(least) {
    const power = 10 ** Math.floor(Math.log10(least));
    return [1, 2, 5, 10].find((k) => k * power >= least) * power;
  }

  function tick(x1, y1, x2, y2) {
    context.strokeStyle = "#9aa3aa";
    context.lineWidth = 1;
    context.beginPath();
    context.moveTo(x1, y1);
    context.lineTo(x2, y2);
    context.stroke();
  }

  function pegs() {
    const y = scale.bandTop(scale.bands.length) + 2;
    context.font = `600 11px ${FONT}`;
    context.textAlign = "center";
    context.textBaseline = "top";
    context.fillStyle = INK;
    for (const peg of chainage.ticks(scale.from, scale.to, chainage.spacing(scale.metersPerPixel() * 84))) {
      const x = Math.round(scale.x(peg.distance)) + 0.5;
      if (x < scale.left + 8 || x > scale.right - 14) continue;
      tick(x, scale.bottom, x, y);
      context.fillText(peg.text, x, y + 2);
    }
    for (const distance of chainage.equations) {
      const x = scale.x(distance);
      if (x < scale.left || x > scale.right) continue;
      context.setLineDash([2, 3]);
      tick(x, scale.top, x, y);
      context.setLineDash([]);
    }
  }

  return { embankment, lines, boringColumns, placeNames, drawNames, fittedBorings, axes, pegs };
}
