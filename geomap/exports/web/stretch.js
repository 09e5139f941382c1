// The stretch card: what lies at the place looked at, how sure that is, and which samples say so.

const ODDS_LEAST = 4; // percent; rarer groups are summed as "others"

function makeStretchCard(data, colors, chainage, lengths) {
  const { steps, cells, trace, legend } = data;

  function row(name, ...value) {
    return element("div", { class: "fact" }, element("dt", null, name), element("dd", null, ...value));
  }

  function verdict(step) {
    const item = legend.suitability[steps.suitability[step] < 0 ? 3 : steps.suitability[step]];
    const shares = [0, 1, 2, 3].map((k) => ({ item: legend.suitability[k], percent: steps[`p${k}`][step] }));
    return element(
      "div",
      { class: "verdict" },
      element("p", { class: "verdict-word" }, swatch(item), element("strong", null, item.name)),
      shareBar(shares, "Probability of each verdict"),
      shareList(shares.filter((share) => share.percent > 0)),
    );
  }

  function shareBar(shares, label) {
    const bar = element("div", { class: "share-bar", role: "img", "aria-label": `${label}: ${shares.filter((s) => s.percent > 0).map((s) => `${s.item.name} ${s.percent}%`).join(", ")}` });
    for (const { item, percent } of shares) {
      if (percent <= 0) continue;
      const part = element("span", null);
      part.style.width = `${percent}%`;
      part.style.background = item.color;
      bar.append(part);
    }
    return bar;
  }

  function shareList(shares) {
    return element(
      "ul",
      { class: "share-list" },
      ...shares.map(({ item, percent }) => element("li", null, swatch(item, item.symbol), element("span", null, item.symbol ? item.name : item.name), element("b", null, percentText(percent)))),
    );
  }

  function formation(step, distance) {
    const cut = steps.cutFill[step];
    if (cut === null) return row("Formation", "not given");
    const word = Math.abs(cut) < 0.005 ? "at grade" : cut < 0 ? `cut ${lengths.text(-cut)}` : `fill ${lengths.text(cut)}`;
    return row("Formation", `level ${lengths.number(steps.formation[step])}, ${word}`);
  }

  function material(step) {
    const words = ["natural ground", "part natural, part imported fill", "imported fill: the design zone lies in the embankment"];
    return steps.material[step] < 0 ? null : row("Design zone in", words[steps.material[step]]);
  }

  function cbr(step) {
    const { low, mid, high } = steps.cbr;
    if (mid[step] === null) return steps.cbrBasis[step] ? row("CBR", isolated(steps.cbrBasis[step])) : null;
    return row("CBR", `${mid[step]}% (${low[step]} to ${high[step]}), `, isolated(steps.cbrBasis[step] || ""));
  }

  // Odds of the cell pointed at, large; then every layer as one thin bar, so that the column reads at a glance.
  function odds(column, layer, distance) {
    const all = data.oddsOf(data.cellAt(column, layer)).map(({ group, percent }) => ({ item: colors.groupItem(group), percent }));
    const named = all.filter((share) => share.percent >= ODDS_LEAST);
    const rest = all.filter((share) => share.percent < ODDS_LEAST).reduce((sum, share) => sum + share.percent, 0);
    const list = shareList(named);
    if (rest > 0) list.append(element("li", { class: "others" }, element("span", null, "others together"), element("b", null, percentText(rest))));
    return [
      element("h3", null, `Soil group ${lengths.number(cells.tops[layer])} to ${lengths.text(cells.bases[layer])} below ground`),
      shareBar(all, "Odds of each soil group"),
      list,
      ladder(column, layer, distance),
    ];
  }

  const layersOf = (column) => data.layerAt(data.columnBase[column] - 1e-6) + 1;

  function ladder(column, layer, distance) {
    const formationDepth = data.formationAt(distance) === null ? null : data.groundAt(distance) - data.formationAt(distance);
    const box = element("div", { class: "ladder", role: "img", "aria-label": "Odds of the soil groups in every layer from the ground down" });
    const layers = layersOf(column);
    for (let k = 0; k < layers; k += 1) {
      const bar = element("div", { class: k === layer ? "rung here" : "rung" });
      // In legend order, not likeliest first: the same group then stands above itself from rung to rung.
      for (const { group, percent } of data.oddsOf(data.cellAt(column, k)).sort((a, b) => a.group - b.group)) {
        const part = element("span", null);
        part.style.width = `${percent}%`;
        part.style.background = colors.groupItem(group).color;
        bar.append(part);
      }
      box.append(bar);
    }
    ladderLetters(column).forEach((letters) => box.append(letters));
    const depth = cells.bases[layers - 1];
    const mark = (at, kind, text) => {
      if (at === null || at < 0 || at > depth) return;
      const line = element("i", { class: `ladder-mark ${kind}` }, text);
      line.style.top = `${(at / depth) * 100}%`;
      box.append(line);
    };
    if (formationDepth !== null) {
      mark(formationDepth, "formation", "formation");
      if (data.corridor.zoneDepth) mark(formationDepth + data.corridor.zoneDepth, "zone", "end of zone");
    }
    return element("div", { class: "ladder-frame" }, element("span", { class: "ladder-top" }, "ground"), box, element("span", { class: "ladder-base" }, lengths.text(depth, 1)));
  }

  // The likeliest group of a run of layers, in letters on its own color.
  function ladderLetters(column) {
    const first = (layer) => (data.oddsOf(data.cellAt(column, layer))[0] || { group: -1 }).group;
    const found = [];
    const layers = layersOf(column);
    for (let top = 0, layer = 1; layer <= layers; layer += 1) {
      if (layer < layers && first(layer) === first(top)) continue;
      if ((layer - top) / layers > 0.07 && first(top) >= 0) {
        const item = colors.groupItem(first(top));
        const odds = data.oddsOf(data.cellAt(column, (top + layer - 1) >> 1)).sort((a, b) => a.group - b.group);
        const before = odds.filter((share) => share.group < first(top)).reduce((sum, share) => sum + share.percent, 0);
        const own = odds.find((share) => share.group === first(top));
        const letters = element("b", { class: "ladder-letters" }, item.symbol);
        letters.style.top = `${(50 * (top + layer)) / layers}%`;
        letters.style.left = `${before + (own ? own.percent : 0) / 2}%`;
        letters.style.color = item.text;
        found.push(letters);
      }
      top = layer;
    }
    return found;
  }

  function nearest(step) {
    if (!steps.nearest[step]) return null;
    return row("Nearest boring", isolated(steps.nearest[step]), `, ${lengths.text(steps.nearestM[step], 0)} away`);
  }

  function samples(step) {
    const first = data.traceStart[step];
    const records = trace.record.slice(first, first + trace.count[step]);
    if (!records.length) return [element("h3", null, "Samples behind it"), element("p", { class: "quiet" }, "No sample bears on this step.")];
    const rows = records.map((record, k) => {
      const weight = trace.weight[first + k] / 10;
      const bar = element("span", { class: "weight" }, element("i", null), `${weight.toFixed(1)}%`);
      bar.firstChild.style.width = `${Math.min(weight, 100) * 0.4}px`;
      return element(
        "tr",
        null,
        element("td", null, bar),
        element("td", null, isolated(trace.boring[record] || ""), " ", isolated(trace.sample[record] || ""), element("small", null, `${depthText(trace.top[record], trace.base[record])}`)),
        element("td", null, isolated(trace.labSheet[record] || "no lab sheet"), element("small", null, isolated(sourceText(trace.file[record], trace.sheet[record], trace.row[record])))),
      );
    });
    const more = trace.more[step] ? `and ${trace.more[step]} more with ${(trace.rest[step] / 10).toFixed(1)}% together` : "";
    return [
      element("h3", null, "Samples behind it"),
      element("table", { class: "behind" }, element("thead", null, element("tr", null, ...["Weight", "Sample, depth", "Lab sheet"].map((name) => element("th", { scope: "col" }, name)))), element("tbody", null, ...rows)),
      more ? element("p", { class: "quiet" }, more) : null,
    ];
  }

  function depthText(top, base) {
    if (top === null) return "";
    return base === null || base === top ? `at ${lengths.text(top)}` : `${lengths.number(top)} to ${lengths.text(base)}`;
  }

  return {
    depthText,
    // One sentence with the answer, for the screen reader and for the profile's slider value.
    sentence(distance, depth) {
      const step = data.stepAt(distance);
      const layer = depth === null ? data.formationLayer(distance) : data.layerAt(depth);
      const [first] = data.oddsOf(data.cellAt(data.columnAt(distance), layer));
      const group = first ? `${colors.groupItem(first.group).symbol} ${first.percent}%` : "group not known";
      const word = legend.suitability[steps.suitability[step]];
      const seen = legend.evidence[steps.evidence[step]];
      return joined([`Chainage ${chainage.text(distance)}`, `${lengths.text(cells.tops[layer])} deep: ${group}`, data.hasFormation && word ? word.name : "", seen ? seen.name : ""], ", ");
    },
    show(distance, depth) {
      const step = data.stepAt(distance);
      const layer = depth === null ? data.formationLayer(distance) : data.layerAt(depth);
      const seen = legend.evidence[steps.evidence[step] < 0 ? 2 : steps.evidence[step]];
      const group = steps.group[step];
      return fill(
        "stretch",
        element("h2", null, "Chainage ", element("b", null, chainage.text(distance))),
        data.hasFormation ? verdict(step) : null,
        element(
          "dl",
          { class: "facts" },
          data.hasFormation ? formation(step, distance) : row("Ground", data.groundKnown ? `level ${lengths.text(data.groundAt(distance))}` : "level not known"),
          material(step),
          group >= 0 ? row("Mostly", swatch(legend.groups[group], legend.groups[group].symbol), ` ${legend.groups[group].name}${steps.probability[step] < 0 ? "" : `, ${steps.probability[step]}%`}`) : null,
          steps.aashto[step] ? row("AASHTO", isolated(steps.aashto[step])) : null,
          cbr(step),
          row("Evidence", swatch(seen), ` ${seen.name}`),
          nearest(step),
          steps.rule[step] ? row("Decided by", isolated(steps.rule[step])) : null,
          data.chainageJumps ? row("Distance", lengths.text(distance, 0)) : null,
        ),
        ...odds(data.columnAt(distance), layer, distance),
        ...samples(step),
      );
    },
  };
}
