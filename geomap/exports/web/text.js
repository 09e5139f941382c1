// Text and page elements. Everything from a corridor reaches the page through textContent, never as HTML:
// a boring may be called <img onerror=...> and must stay a name.

// One font for the page and for what is drawn on canvases, so that measured labels keep their measure.
const FONT = getComputedStyle(document.documentElement).fontFamily;

function element(tag, attributes, ...children) {
  const node = document.createElement(tag);
  for (const [name, value] of Object.entries(attributes || {})) {
    if (value !== null && value !== undefined && value !== false) node.setAttribute(name, value);
  }
  node.append(...children.filter((child) => child !== null && child !== undefined && child !== ""));
  return node;
}

// Names and remarks may run right to left; isolating them keeps the words around them in order.
function isolated(text) {
  return element("bdi", null, text);
}

function fill(id, ...children) {
  const node = document.getElementById(id);
  node.replaceChildren(...children.filter((child) => child !== null && child !== undefined && child !== ""));
  return node;
}

function percentText(percent) {
  return percent === null || percent < 0 ? "not known" : `${percent}%`;
}

function shortened(text, length) {
  const letters = Array.from(text); // by code point: half of a pair would show as a broken sign
  return letters.length > length ? letters.slice(0, length - 1).join("") + "…" : text;
}

// Digits in groups of three; the browser's own formatter takes a tenth of the start-up time to wake.
function grouped(number, separator) {
  return String(number).replace(/\B(?=(\d{3})+$)/g, separator);
}

function joined(parts, separator) {
  return parts.filter((part) => part !== null && part !== undefined && part !== "").join(separator);
}

// Where a value was read: what a person needs to open the right row of the right file.
function sourceText(file, sheet, row) {
  return joined([file, sheet ? `sheet ${sheet}` : "", row ? `${String(row).includes(",") ? "rows" : "row"} ${row}` : ""], ", ");
}

function makeLengths(unit) {
  const decimals = { m: 2, ft: 1, "us-ft": 1 }[unit.name];
  const name = unit.name === "m" ? "m" : "ft"; // a survey foot differs by two parts in a million: one word serves
  const number = (meters, digits) => (meters * unit.perMeter).toFixed(digits === undefined ? decimals : digits);
  return {
    name,
    perMeter: unit.perMeter,
    number,
    text: (meters, digits) => (meters === null ? "not known" : `${number(meters, digits)} ${name}`),
    // Whole corridors read better in kilometers; feet have no such habit, so they only get a separator.
    long(meters) {
      if (name === "m" && meters >= 1000) return `${(meters / 1000).toFixed(2)} km`;
      return `${grouped(Math.round(meters * unit.perMeter), ",")} ${name}`;
    },
  };
}
