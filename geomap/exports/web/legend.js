// The legend beside the choice of color: only what occurs, in color, hatch and letters.

function drawLegend(mode, colors, data) {
  const items = colors.present(mode).map((item) => {
    const name = item.symbol && item.name !== item.symbol ? item.name : item.symbol ? "" : item.name;
    return element("li", null, swatch(item), item.symbol ? element("b", null, item.symbol) : null, name ? element("span", null, name) : null);
  });
  const key = ([kind, name]) => element("li", null, element("i", { class: `key ${kind}` }), element("span", null, name));
  const formation = data.hasFormation ? [["formation", "formation"]] : [];
  const zone = data.hasFormation && data.corridor.zoneDepth ? [["zone", "base of design zone"]] : [];
  const leftOut = data.borings.used.includes(0) ? [["hole out", "left out"]] : [];
  const doubt = mode.strength ? element("li", { class: "doubt" }, element("i", { class: "key fade" }), element("span", null, "pale and without hatch: less sure")) : null;
  fill("legend", ...items, doubt);
  fill("line-keys", ...[["ground", "ground"], ...formation, ...zone].map(key));
  fill("plan-keys", ...[["hole", "boring"], ...leftOut].map(key));
}
