// What a color stands for: one list of classes for each way to color the page, used by the line, the profile
// and the legend alike.

const PAPER = [255, 255, 255];
const STRENGTHS = 20; // shades from unsure to sure

function rgbFromHex(hex) {
  return [1, 3, 5].map((at) => parseInt(hex.slice(at, at + 2), 16));
}

// Pale is unsure: the color is mixed with paper. Below 30 % the group is hardly more than a guess; the shade
// stays just visible there, so that a gap in the profile is never mistaken for an unsure cell.
function shadeOf(hex, percent) {
  const share = Math.min(Math.max((percent - 30) / 65, 0), 1);
  const strength = 0.2 + 0.8 * share;
  const mixed = rgbFromHex(hex).map((part, i) => Math.round(PAPER[i] + (part - PAPER[i]) * strength));
  return `rgb(${mixed.join(",")})`;
}

// A repeating tile of the palette's hatch. `ink` carries its own opacity.
function hatchPattern(context, path, tile, ink) {
  if (!path) return null;
  const scale = window.devicePixelRatio || 1;
  const canvas = document.createElement("canvas");
  canvas.width = Math.round(tile * scale);
  canvas.height = canvas.width;
  const brush = canvas.getContext("2d");
  brush.scale(canvas.width / tile, canvas.width / tile);
  brush.strokeStyle = ink;
  brush.lineWidth = 1;
  brush.stroke(new Path2D(path));
  const pattern = context.createPattern(canvas, "repeat");
  pattern.setTransform(new DOMMatrix().scale(tile / canvas.width));
  return pattern;
}

// A swatch for legends and cards: color, hatch and, where there is one, the letters of the group.
function swatch(item, letters) {
  const space = "http://www.w3.org/2000/svg";
  const size = 16;
  const svg = document.createElementNS(space, "svg");
  const width = letters ? Math.max(30, 9 + 7 * letters.length) : 24;
  for (const [name, value] of [["viewBox", `0 0 ${width} ${size}`], ["width", width], ["height", size], ["aria-hidden", "true"], ["class", "swatch"]]) svg.setAttribute(name, value);
  const add = (tag, attributes) => {
    const node = document.createElementNS(space, tag);
    Object.entries(attributes).forEach(([name, value]) => node.setAttribute(name, value));
    svg.append(node);
    return node;
  };
  add("rect", { width, height: size, fill: item.color });
  if (!letters && item.hatch) {
    for (let x = 0; x < width; x += size) {
      add("path", { d: item.hatch, transform: `translate(${x} 0)`, fill: "none", stroke: item.text, "stroke-opacity": 0.6 });
    }
  }
  if (letters) {
    add("text", { x: width / 2, y: 12, "text-anchor": "middle", fill: item.text }).textContent = letters;
  }
  return svg;
}

function makeColors(data) {
  const { steps, cells, legend } = data;
  const ramp = legend.ramp;
  const rampClass = (percent) => ramp.findIndex((item) => percent < item.below);
  // A step that is not assessed for want of data, or mostly not assessed, says nothing about unsuitable soil; zero
  // would look like good news.
  const isBlank = (step) => steps.p3[step] >= 50 || steps.p2[step] < 0 || (steps.suitability[step] === 3 && steps.evidence[step] === 2);
  const unsuitableStep = (step) => (isBlank(step) ? ramp.length : rampClass(steps.p2[step]));
  // Soil that is not determined may have its own symbol among the groups; it is one class, not two.
  const undetermined = legend.groups.findIndex((item) => item.symbol === legend.unknown.symbol);
  const unknown = undetermined < 0 ? legend.groups.length + 1 : undetermined;
  const modes = {
    group: {
      title: `Soil group (${legend.systemTitle})`,
      classes: [...legend.groups, legend.imported, legend.unknown],
      step: (step) => {
        if (steps.group[step] >= 0) return steps.group[step];
        return steps.material[step] === 2 ? legend.groups.length : unknown;
      },
      cell: (cell) => (cells.group[cell] < 0 ? unknown : cells.group[cell]),
      strength: (cell) => cells.probability[cell],
      stepStrength: (step) => (steps.group[step] >= 0 ? steps.probability[step] : 100),
    },
    suitability: {
      title: "Suitability",
      classes: legend.suitability,
      step: (step) => (steps.suitability[step] < 0 ? 3 : steps.suitability[step]),
      cell: (cell) => (cells.suitability[cell] < 0 ? 3 : cells.suitability[cell]),
    },
    unsuitable: {
      title: "Probability of unsuitable soil",
      classes: [...ramp, legend.suitability[3]],
      step: unsuitableStep,
      cell: (cell) => (cells.unsuitable[cell] < 0 ? ramp.length : rampClass(cells.unsuitable[cell])),
    },
    evidence: {
      title: "Evidence",
      classes: legend.evidence,
      step: (step) => (steps.evidence[step] < 0 ? 2 : steps.evidence[step]),
      cell: (cell) => (cells.evidence[cell] < 0 ? 2 : cells.evidence[cell]),
    },
  };
  for (const mode of Object.values(modes)) {
    mode.shades = mode.classes.map((item) =>
      Array.from({ length: STRENGTHS + 1 }, (_, k) => shadeOf(item.color, (k * 100) / STRENGTHS)),
    );
    mode.shade = (cell) => {
      const percent = mode.strength ? mode.strength(cell) : 100;
      return mode.shades[mode.cell(cell)][Math.round((Math.max(percent, 0) * STRENGTHS) / 100)];
    };
  }

  // Only classes that occur belong in a legend.
  function present(mode) {
    const seen = new Set();
    for (let step = 0; step < steps.from.length; step += 1) seen.add(mode.step(step));
    for (let cell = 0; cell < cells.group.length; cell += 1) seen.add(mode.cell(cell));
    if (mode === modes.group) data.samples.group.forEach((group) => group >= 0 && seen.add(group));
    return mode.classes.filter((_, i) => seen.has(i));
  }

  return { modes, present, groupItem: (group) => (group < 0 ? legend.unknown : legend.groups[group]) };
}
