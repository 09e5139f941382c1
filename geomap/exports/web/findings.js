// The findings: what is asked about single input values, as a table to filter.

const FIRST_ROWS = 60; // more are shown on request, so that a dirty corridor does not slow the page down

function makeFindings(data) {
  const { findings } = data;
  const count = findings.severity.length;
  const severities = ["error", "warning", "note"];
  let chosen = "all";
  let limit = FIRST_ROWS;
  let open = () => {};

  const where = (i) => joined([sourceText(findings.file[i], findings.sheet[i], findings.row[i]), findings.heading[i]], ", ");
  const tag = (i) => element("span", { class: `severity ${severities.includes(findings.severity[i]) ? findings.severity[i] : "note"}` }, findings.severity[i] || "note");

  function line(i) {
    return element("li", null, tag(i), " ", isolated((findings.topic[i] || "").replaceAll("_", " ")), ": found ", isolated(findings.found[i] || "nothing"), "; ", isolated(findings.advice[i] || ""), element("div", { class: "source" }, isolated(where(i))));
  }

  // A boring that the page knows is opened from here.
  function boring(i) {
    const name = findings.boring[i] || "";
    const number = data.boringNumber.get(name);
    if (number === undefined) return isolated(name);
    const button = element("button", { type: "button", class: "link", title: "Open this boring" }, isolated(name));
    button.addEventListener("click", () => open(number));
    return button;
  }

  function row(i) {
    const cell = (name, ...parts) => element("td", { "data-name": name }, ...parts);
    return element(
      "tr",
      null,
      cell("Severity", tag(i)),
      cell("Where", isolated(where(i))),
      cell("Boring, sample", boring(i), " ", isolated(findings.sample[i] || "")),
      cell("Found", isolated(findings.found[i] || "nothing")),
      cell("Allowed", isolated(findings.allowed[i] || "")),
      cell("Action", (findings.action[i] || "").replaceAll("_", " ")),
      cell("What to do", isolated(findings.advice[i] || "")),
    );
  }

  function draw() {
    const rows = [];
    for (let i = 0; i < count; i += 1) if (chosen === "all" || findings.severity[i] === chosen) rows.push(i);
    fill("findings-rows", ...rows.slice(0, limit).map(row));
    document.getElementById("findings-count").textContent = rows.length > limit ? `${limit} of ${rows.length} shown` : `${rows.length} shown`;
    document.getElementById("findings-more").hidden = rows.length <= limit;
  }

  const total = (severity) => findings.severity.filter((word) => word === severity).length;
  document.getElementById("findings-total").textContent = String(count);
  const select = document.getElementById("findings-severity");
  for (const [value, name] of [["all", `All (${count})`], ...severities.map((word) => [word, `${word} (${total(word)})`])]) {
    select.append(element("option", { value }, name));
  }
  select.addEventListener("change", () => {
    chosen = select.value;
    limit = FIRST_ROWS;
    draw();
  });
  document.getElementById("findings-more").addEventListener("click", () => {
    limit = count;
    draw();
  });
  draw();

  return {
    total,
    line,
    onOpen(listener) {
      open = listener;
    },
    of(name) {
      const rows = [];
      for (let i = 0; i < count; i += 1) if (findings.boring[i] === name) rows.push(i);
      return rows;
    },
  };
}
