// The legend beside the choice of color: only what occurs, in color, hatch and letters.

const MOST_NAMED = 7;

function drawLegend(mode, colors, data) {
  const present = colors.present(mode);
  // A dozen groups with their names would push the drawings off the screen: letters then stand alone, and the
  // names are in the card of soil groups.
  const named = present.length <= MOST_NAMED;
  const items = present.map((item) => {
    const name = item.name === item.symbol ? "" : item.name;
    const words = name ? element("span", { class: named || !item.symbol ? null : "unseen" }, name) : null;
    return element("li", { title: name || null }, swatch(item), item.symbol ? element("b", null, item.symbol) : null, words);
  });
  const key = ([kind, name]) => element("li", null, element("i", { class: `key ${kind}` }), element("span", null, name));
  const formation = data.hasFormation ? [["formation", "formation"]] : [];
  const zone = data.hasFormation && data.corridor.zoneDepth ? [["zone", "base of design zone"]] : [];
  const leftOut = data.borings.used.includes(0) ? [["hole out", "left out"]] : [];
  const doubt = mode.strength ? element("li", { class: "doubt" }, element("i", { class: "key fade" }), element("span", null, "pale and without hatch: less sure")) : null;
  const judges = mode === colors.modes.suitability || mode === colors.modes.unsuitable;
  const limits = judges && data.summary.limits ? element("li", { class: "limits" }, element("span", null, "Verdicts: ", isolated(data.summary.limits))) : null;
  fill("legend", ...items, doubt, limits);
  fill("line-keys", ...[["ground", "ground"], ...formation, ...zone].map(key));
  fill("plan-keys", ...[["hole", "boring"], ...leftOut].map(key));
}

// All soil groups of the corridor by name, at the end of the cards.
function drawGroupNames(colors, data) {
  const items = colors.present(colors.modes.group).filter((item) => item.symbol);
  fill("group-names", ...items.map((item) => element("li", null, swatch(item, item.symbol), element("span", null, item.name))));
}
