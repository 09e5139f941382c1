// The title block: the corridor in figures, and what must be known before the page is believed.

function drawSummary(data, lengths, chainage, findings) {
  const { corridor, summary, legend } = data;
  document.title = `${corridor.name}: ground along the line`;
  fill("corridor-name", isolated(corridor.name));
  fill("corridor-line", joined([corridor.use === "pipeline" ? "Pipeline corridor" : "Road corridor"], ""), corridor.issue ? element("span", { class: "issue" }, "Issue ", isolated(corridor.issue)) : null);
  fill("corridor-crs", isolated(joined([corridor.crsName, corridor.verticalDatum ? `levels: ${corridor.verticalDatum}` : ""], "; ")));
  fill("length", lengths.long(corridor.length));
  fill("ends", `${chainage.text(0, 0)} to ${chainage.text(corridor.length, 0)}`);

  const counts = summary.counts;
  const borings = counts.borings || { read: data.borings.name.length, used: 0, leftOut: 0 };
  fill("borings-read", String(borings.read));
  fill("borings-used", `${borings.used} used, ${borings.leftOut} left out`);
  const samples = counts.samples;
  fill("samples-read", samples ? `${samples.read} samples, ${samples.leftOut} left out` : "");

  for (const severity of ["error", "warning", "note"]) {
    const n = findings.total(severity);
    fill(`total-${severity}`, String(n));
  }
  drawLengths();
  fill("statement", summary.statement ? isolated(summary.statement) : null, data.plan.note ? element("span", null, " ", isolated(data.plan.note)) : null);
  // On the screen the limits stand beside the legend of the verdicts; paper has one legend for good.
  if (summary.limits && data.hasFormation) document.getElementById("statement").append(element("span", { class: "on-paper" }, " Verdicts: ", isolated(summary.limits), "."));
  fill("cautions", ...corridor.cautions.map((text) => element("li", null, isolated(text))));

  function withoutVerdicts() {
    if (!data.formationGiven) return "No formation was given: soil groups by depth only.";
    const why = data.groundKnown ? "no level of it lies on the line" : summary.groundLevels || "ground not known";
    return `A formation was given, but cut and fill cannot be told and the design zone is not assessed: ${why}.`;
  }

  // Length by verdict and evidence: one bar for all, and the figures under it.
  function drawLengths() {
    const box = document.getElementById("lengths");
    const total = corridor.length || 1;
    if (!data.hasFormation) {
      fill("lengths", element("p", { class: "quiet" }, isolated(withoutVerdicts())));
      return;
    }
    const rows = summary.lengths.map((parts, k) => ({ item: legend.suitability[k], parts, sum: parts.reduce((a, b) => a + b, 0) })).filter((row) => row.sum > 0);
    const bar = element("div", { class: "share-bar tall", "aria-hidden": "true" });
    for (const { item, sum } of rows) {
      const part = element("span", null);
      part.style.width = `${(100 * sum) / total}%`;
      part.style.background = item.color;
      bar.append(part);
    }
    const head = ["Verdict", "Length", "Observed", "Inferred", "No data"].map((name) => element("th", { scope: "col" }, name));
    const body = rows.map(({ item, parts, sum }) =>
      element("tr", null, element("th", { scope: "row" }, swatch(item), " ", item.name), element("td", null, lengths.long(sum)), ...parts.map((part) => element("td", null, part ? lengths.long(part) : "–"))),
    );
    box.replaceChildren(bar, element("table", null, element("thead", null, element("tr", null, ...head)), element("tbody", null, ...body)));
  }
}
