// The boring card: where the hole is, what was found in it, and what is still asked about it.

const TEST_NAMES = {
  fines: "fines",
  liquidLimit: "LL",
  plasticLimit: "PL",
  plasticityIndex: "PI",
  moisture: "moisture",
  organic: "organic",
  cbrSoaked: "CBR soaked",
  cbrUnsoaked: "CBR unsoaked",
  cbrInPlace: "CBR in place",
  sptN: "SPT N",
};

const PLAIN_TESTS = new Set(["liquidLimit", "plasticLimit", "plasticityIndex", "sptN"]); // written without a percent sign

function makeBoringCard(data, chainage, lengths, findings, stretchCard) {
  const { borings, samples, strata, legend } = data;
  const { depthText } = stretchCard;

  function fact(name, ...value) {
    return value.every((part) => part === null || part === "") ? null : element("div", { class: "fact" }, element("dt", null, name), element("dd", null, ...value));
  }

  function position(number) {
    if (borings.distance[number] === null) return fact("Chainage", "not on the line");
    const offset = borings.offset[number];
    const side = borings.side[number];
    const aside = offset === null || side === "on line" ? "on the line" : `${lengths.text(Math.abs(offset), 1)} ${side || ""}`;
    return fact("Chainage", `${chainage.text(borings.distance[number])}, ${aside}`);
  }

  function tests(row) {
    const parts = Object.entries(TEST_NAMES).map(([key, name]) => {
      const value = samples.tests[key][row];
      if (value === null) return "";
      const bound = (samples.bounds[key] || [])[row] || "";
      return `${name} ${bound}${value}${PLAIN_TESTS.has(key) ? "" : "%"}`;
    });
    if (samples.nonplastic[row] === 1) parts.splice(1, 0, "NP");
    return joined(parts, ", ");
  }

  function group(row) {
    if (samples.group[row] >= 0) {
      const item = legend.groups[samples.group[row]];
      return [swatch(item, item.symbol), " ", isolated(samples.name[row] || item.name)];
    }
    return [swatch(legend.unknown), " not determined"];
  }

  function sampleRow(row) {
    const notes = joined(
      [
        samples.basis[row] ? `by ${samples.basis[row]}` : "",
        samples.nearLimit[row] === 1 ? "near a limit" : "",
        samples.aashto[row] ? `${samples.aashto[row]}${samples.groupIndex[row] === null ? "" : ` (${samples.groupIndex[row]})`}` : "",
        samples.group[row] < 0 && samples.candidates[row] ? `may be ${samples.candidates[row]}` : "",
      ],
      ", ",
    );
    const verdict = samples.suitability[row] < 0 ? "" : legend.suitability[samples.suitability[row]].name;
    const line = (text, kind) => (text ? element("div", { class: kind }, isolated(text)) : null);
    return element(
      "tr",
      { class: samples.used[row] === 0 ? "left-out" : null },
      element("th", { scope: "row" }, depthText(samples.top[row], samples.base[row]), element("small", null, isolated(samples.sample[row] || ""))),
      element(
        "td",
        null,
        element("div", { class: "group-line" }, ...group(row)),
        line(notes, "quiet"),
        line(samples.why[row], "quiet"),
        line(tests(row), "tests"),
        line(verdict && joined([verdict, samples.rule[row]], ": "), "quiet"),
        samples.used[row] === 0 ? line(`left out: ${samples.reason[row] || "no reason given"}`, "quiet") : null,
        line(joined([samples.labSheet[row], sourceText(samples.file[row], samples.sheet[row], samples.row[row])], " · "), "source"),
      ),
    );
  }

  function stratumRow(row) {
    const named = strata.group[row] < 0 ? null : legend.groups[strata.group[row]];
    return element(
      "tr",
      null,
      element("th", { scope: "row" }, depthText(strata.top[row], strata.base[row])),
      element("td", null, named ? swatch(named, named.symbol) : strata.visual[row] ? isolated(strata.visual[row]) : null, " ", isolated(strata.description[row] || ""), element("div", { class: "quiet" }, isolated(joined([strata.unit[row], strata.origin[row]], ", ")))),
    );
  }

  function table(title, rows, name) {
    if (!rows.length) return [];
    const head = element("thead", null, element("tr", null, element("th", { scope: "col" }, "Depth"), element("th", { scope: "col" }, name)));
    return [element("h3", null, title), element("table", { class: "log" }, head, element("tbody", null, ...rows))];
  }

  // A drawn log: logged layers on the left, samples on the right, depths between.
  function drawLog(number) {
    const depth = borings.depth[number] || 0;
    if (!depth || !(data.strataOf[number].length + data.samplesOf[number].length)) return null;
    const canvas = element("canvas", { class: "log-drawing", "aria-hidden": "true", width: 620, height: 440 });
    const context = canvas.getContext("2d");
    context.scale(2, 2);
    const y = (at) => 22 + (at / depth) * 190;
    const block = (item, x, width, from, to, percent) => {
      const height = Math.max(y(to) - y(from), 4);
      context.fillStyle = shadeOf(item.color, percent);
      context.fillRect(x, y(from), width, height);
      const pattern = hatchPattern(context, item.hatch, 16, item.text === "#ffffff" && percent > 80 ? "rgba(255,255,255,0.5)" : "rgba(0,0,0,0.4)");
      if (pattern) {
        context.fillStyle = pattern;
        context.fillRect(x, y(from), width, height);
      }
      context.strokeStyle = "#1c2733";
      context.lineWidth = 0.75;
      context.strokeRect(x, y(from), width, height);
    };
    context.font = `11px ${FONT}`;
    context.textBaseline = "middle";
    for (const row of data.strataOf[number]) {
      const item = strata.group[row] < 0 ? legend.unknown : legend.groups[strata.group[row]];
      block(item, 40, 54, strata.top[row], strata.base[row] ?? depth, 60);
    }
    let last = -99;
    // Of a boring that is left out, everything is; its log is still what was found in the hole.
    const all = borings.used[number] !== 1;
    const drawn = data.samplesOf[number].filter((row) => samples.top[row] !== null && (all || samples.used[row] !== 0));
    for (const row of drawn) {
      const base = samples.base[row] ?? samples.top[row];
      const item = samples.group[row] < 0 ? legend.unknown : legend.groups[samples.group[row]];
      block(item, 104, 34, samples.top[row], base, 100);
      const at = Math.max((y(samples.top[row]) + y(base)) / 2, last + 12);
      last = at;
      context.fillStyle = "#1c2733";
      context.textAlign = "left";
      context.fillText(joined([item.symbol, shortened(samples.sample[row] || "", 14)], "  "), 144, at);
    }
    drawTests(context, drawn, y);
    context.strokeStyle = "#1c2733";
    context.strokeRect(40, y(0), 54, y(depth) - y(0));
    context.fillStyle = "#4d5a66";
    context.textAlign = "right";
    const every = depth * lengths.perMeter > 12 ? 5 : depth * lengths.perMeter > 5 ? 2 : 1;
    for (let mark = 0; mark <= depth * lengths.perMeter + 1e-6; mark += every) {
      const at = y(mark / lengths.perMeter);
      context.fillText(String(mark), 28, at);
      context.fillRect(32, at - 0.5, 8, 1);
    }
    return canvas;
  }

  // Fines as a bar, plastic to liquid limit as a line, moisture as a dot, on one scale from 0 to 100 %.
  function drawTests(context, rows, y) {
    const [left, right] = [224, 300];
    const x = (percent) => left + (Math.min(percent, 100) / 100) * (right - left);
    context.fillStyle = "#4d5a66";
    context.font = `10px ${FONT}`;
    context.textAlign = "center";
    for (const percent of [0, 50, 100]) {
      context.fillText(`${percent}${percent ? "" : "%"}`, x(percent), 8);
      context.fillRect(x(percent) - 0.25, 15, 0.5, 197);
    }
    for (const row of rows) {
      const { fines, liquidLimit, plasticLimit, plasticityIndex, moisture } = samples.tests;
      const at = y((samples.top[row] + (samples.base[row] ?? samples.top[row])) / 2);
      if (fines[row] !== null) {
        context.fillStyle = "#c2c9ce";
        context.fillRect(left, at - 4, x(fines[row]) - left, 8);
      }
      context.fillStyle = "#1c2733";
      const plastic = plasticLimit[row] ?? (plasticityIndex[row] === null ? null : liquidLimit[row] - plasticityIndex[row]);
      if (liquidLimit[row] !== null && plastic !== null) {
        context.fillRect(x(plastic), at - 1, x(liquidLimit[row]) - x(plastic), 2);
        for (const end of [plastic, liquidLimit[row]]) context.fillRect(x(end) - 0.75, at - 4, 1.5, 8);
      }
      if (moisture[row] === null) continue;
      context.beginPath();
      context.arc(x(moisture[row]), at, 2.6, 0, 2 * Math.PI);
      context.fillStyle = moisture[row] > 100 ? "#ffffff" : "#c4006a"; // hollow: beyond the scale
      context.strokeStyle = "#c4006a";
      context.lineWidth = 1.5;
      context.fill();
      context.stroke();
    }
  }

  function leftOutNote(number) {
    const count = data.samplesOf[number].length + data.strataOf[number].length;
    return count ? "What was read of it is shown below and bears on no step." : "No samples and no layers of it were read.";
  }

  return {
    show(number) {
      const used = borings.used[number] === 1;
      const asked = findings.of(borings.name[number]);
      const close = element("button", { type: "button", class: "close", id: "close-boring" }, "Close");
      fill(
        "boring",
        element("div", { class: "card-head" }, element("h2", { tabindex: "-1", id: "boring-title" }, "Boring ", element("b", null, isolated(borings.name[number]))), close),
        used ? null : element("p", { class: "notice" }, "Left out: ", isolated(borings.reason[number] || "no reason given"), `. ${leftOutNote(number)}`),
        element(
          "dl",
          { class: "facts" },
          position(number),
          fact("Ground", borings.ground[number] === null ? "level not known" : `level ${lengths.number(borings.ground[number])}`),
          fact("Depth", lengths.text(borings.depth[number])),
          fact("Made", isolated(joined([borings.method[number], borings.date[number]], ", "))),
          borings.remarks[number] ? fact("Remarks", isolated(borings.remarks[number])) : null,
          fact("Source", isolated(sourceText(borings.file[number], borings.sheet[number], borings.row[number]))),
        ),
        drawLog(number),
        data.samplesOf[number].length ? element("p", { class: "log-key quiet" }, element("i", { class: "fines" }), "fines ", element("i", { class: "limits" }), "plastic to liquid limit ", element("i", { class: "moisture" }), "moisture") : null,
        ...(asked.length ? [element("h3", null, `Findings about it: ${asked.length}`), element("ul", { class: "asked" }, ...asked.map(findings.line))] : []),
        ...table("Samples", data.samplesOf[number].map(sampleRow), "Soil, tests, lab sheet"),
        ...table("Layers as logged", data.strataOf[number].map(stratumRow), "Description"),
      );
      return close;
    },
  };
}
