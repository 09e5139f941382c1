// The data block of the page, unpacked once. web_columns.py packs what is unpacked here.

const ALPHABET = "0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz";

// Calls that arrive within one frame become one.
function oncePerFrame(act) {
  let waiting = false;
  return () => {
    if (waiting) return;
    waiting = true;
    requestAnimationFrame(() => {
      waiting = false;
      act();
    });
  };
}

function unpackCodes(text) {
  const codes = new Int8Array(text.length);
  for (let i = 0; i < text.length; i += 1) codes[i] = ALPHABET.indexOf(text[i]); // "-" is not found: -1
  return codes;
}

function unpackPercents(text) {
  const percents = new Int8Array(text.length / 2);
  for (let i = 0; i < percents.length; i += 1) {
    const pair = text.slice(2 * i, 2 * i + 2);
    percents[i] = pair === "--" ? -1 : parseInt(pair, 36);
  }
  return percents;
}

function unpackWords(column) {
  return column.i.map((place) => (place < 0 ? null : column.w[place]));
}

// Every { w, i } pair inside a table, at any depth, becomes a plain array of texts.
function unpackTable(table) {
  if (table === null || typeof table !== "object" || Array.isArray(table)) return table;
  if (Array.isArray(table.w) && Array.isArray(table.i)) return unpackWords(table);
  return Object.fromEntries(Object.entries(table).map(([name, column]) => [name, unpackTable(column)]));
}

const CODED = ["group", "evidence", "suitability", "material", "used", "nearLimit", "nonplastic"];
const SHARES = ["probability", "unsuitable", "p0", "p1", "p2", "p3"];

function unpackCoded(table) {
  for (const name of CODED) if (typeof table[name] === "string") table[name] = unpackCodes(table[name]);
  for (const name of SHARES) if (typeof table[name] === "string") table[name] = unpackPercents(table[name]);
  return table;
}

// The last entry of a rising list that is not above `value`; -1 where all are.
function lastAtOrBelow(list, value) {
  let low = -1;
  let high = list.length - 1;
  while (low < high) {
    const middle = (low + high + 1) >> 1;
    if (list[middle] <= value) low = middle;
    else high = middle - 1;
  }
  return low;
}

function between(list, values, at) {
  const i = Math.min(Math.max(lastAtOrBelow(list, at), 0), list.length - 2);
  if (i < 0) return list.length ? values[0] : null;
  const a = values[i];
  const b = values[i + 1];
  if (a === null || b === null) return null;
  const width = list[i + 1] - list[i];
  return width > 0 ? a + ((b - a) * (at - list[i])) / width : a;
}

// Levels are given in the middle of steps; half a step at either end continues the slope beside it.
function padEnds(ground, length) {
  const n = ground.distance.length;
  if (n < 2) return;
  const ends = [Math.min(0, ground.distance[0]), Math.max(length, ground.distance[n - 1])];
  const padded = ["ground", "formation"].map((name) => ends.map((at) => between(ground.distance, ground[name], at)));
  ["ground", "formation"].forEach((name, k) => {
    ground[name].unshift(padded[k][0]);
    ground[name].push(padded[k][1]);
  });
  ground.distance.unshift(ends[0]);
  ground.distance.push(ends[1]);
}

function readData() {
  const raw = JSON.parse(document.getElementById("geomap-data").textContent);
  const data = unpackTable(raw);
  for (const table of [data.steps, data.cells, data.borings, data.samples, data.strata]) unpackCoded(table);
  const { steps, cells } = data;
  data.length = data.corridor.length;
  data.layers = cells.tops.length;
  data.oddsTexts = cells.odds.split(" ");
  // The base of the deepest cell of each column: columns under a deep cut reach farther down than others.
  data.columnBase = cells.from.map((_, column) => {
    let layer = data.layers - 1;
    while (layer > 0 && cells.group[column * data.layers + layer] < 0) layer -= 1;
    return cells.bases[layer];
  });
  padEnds(data.ground, data.length);
  data.hasFormation = steps.formation.some((level) => level !== null);
  // A formation that was read may still be of no use: without ground levels nobody can tell cut from fill.
  const given = data.summary.counts.formation;
  data.formationGiven = data.hasFormation || Boolean(given && given.read);
  data.groundKnown = data.ground.ground.some((level) => level); // drawn at 0 where nobody gave a level

  data.stepAt = (distance) => Math.min(Math.max(lastAtOrBelow(steps.from, distance), 0), steps.from.length - 1);
  data.columnAt = (distance) => Math.min(Math.max(lastAtOrBelow(cells.from, distance), 0), cells.from.length - 1);
  data.layerAt = (depth) => Math.min(Math.max(lastAtOrBelow(cells.tops, depth), 0), data.layers - 1);
  data.cellAt = (column, layer) => column * data.layers + layer;
  data.groundAt = (distance) => between(data.ground.distance, data.ground.ground, distance);
  data.formationAt = (distance) => between(data.ground.distance, data.ground.formation, distance);

  // Odds of one cell, likeliest first: [{ group, percent }].
  data.oddsOf = (cell) => {
    const text = data.oddsTexts[cell] || "";
    const odds = [];
    for (let i = 0; i < text.length; i += 3) {
      odds.push({ group: ALPHABET.indexOf(text[i]), percent: parseInt(text.slice(i + 1, i + 3), 36) });
    }
    return odds;
  };

  // The layer that a reader means when pointing at the line only: the top of the design zone, or the ground
  // surface where the formation lies above it.
  data.formationLayer = (distance) => {
    const ground = data.groundAt(distance);
    const formation = data.formationAt(distance);
    if (ground === null || formation === null) return 0;
    return data.layerAt(Math.max(ground - formation, 0) + 1e-6);
  };

  // Where the records behind each step begin in the list of all.
  data.traceStart = [0];
  data.trace.count.forEach((count, step) => data.traceStart.push(data.traceStart[step] + count));

  data.samplesOf = data.borings.name.map(() => []);
  data.samples.boring.forEach((boring, i) => boring >= 0 && data.samplesOf[boring].push(i));
  data.strataOf = data.borings.name.map(() => []);
  data.strata.boring.forEach((boring, i) => boring >= 0 && data.strataOf[boring].push(i));
  const byDepth = (table) => (a, b) => table.top[a] - table.top[b];
  data.samplesOf.forEach((rows) => rows.sort(byDepth(data.samples)));
  data.strataOf.forEach((rows) => rows.sort(byDepth(data.strata)));
  data.boringNumber = new Map(data.borings.name.map((name, i) => [name, i]));
  return data;
}
