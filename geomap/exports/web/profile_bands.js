// The rows under the profile: cut and fill, suitability of the design zone, evidence; and the narrow strip of the
// whole line beneath, which shows what part of it the profile has in view.

const BAND_NAMES = { cutFill: "Cut, fill", suitability: "Suitability", evidence: "Evidence" };

function makeBands(context, data, scale, colors, lengths, cellPainter) {
  const { steps } = data;

  function runsInView(classOf) {
    const found = [];
    const last = data.stepAt(scale.to);
    for (let step = data.stepAt(scale.from); step <= last; step += 1) {
      const of = classOf(step);
      const run = found[found.length - 1];
      if (run && run.of === of) run.to = steps.to[step];
      else found.push({ of, from: steps.from[step], to: steps.to[step] });
    }
    return found.map((run) => ({ ...run, left: Math.max(scale.x(run.from), scale.left), right: Math.min(scale.x(run.to), scale.right) }));
  }

  function coloredBand(mode, top) {
    for (const run of runsInView(mode.step)) {
      const item = mode.classes[run.of];
      context.fillStyle = item.color;
      context.fillRect(run.left, top, run.right - run.left, BAND_HEIGHT - 3);
      if (item.hatch) {
        context.fillStyle = cellPainter.patternOf(item);
        context.fillRect(run.left, top, run.right - run.left, BAND_HEIGHT - 3);
      }
      const width = context.measureText(item.name).width;
      if (width + 14 > run.right - run.left) continue;
      // On its own plate: a word on a hatch is hard to read.
      const middle = (run.left + run.right) / 2;
      context.fillStyle = item.color;
      context.fillRect(middle - width / 2 - 4, top, width + 8, BAND_HEIGHT - 3);
      context.fillStyle = item.text;
      context.fillText(item.name, middle, top + BAND_HEIGHT / 2 - 1);
    }
  }

  function cutFillBand(top) {
    context.fillStyle = "#f3f4f0";
    context.fillRect(scale.left, top, scale.right - scale.left, BAND_HEIGHT - 3);
    const signOf = (step) => (steps.cutFill[step] === null ? 0 : Math.sign(Math.round(steps.cutFill[step] * 100)));
    for (const run of runsInView(signOf)) {
      const first = data.stepAt(run.from + 1e-6);
      const last = data.stepAt(run.to - 1e-6);
      let most = 0;
      for (let step = first; step <= last; step += 1) most = Math.max(most, Math.abs(steps.cutFill[step] || 0));
      const word = run.of < 0 ? "cut" : run.of > 0 ? "fill" : "";
      if (!word) continue;
      context.fillStyle = run.of < 0 ? "#d9dde0" : "#eceee6";
      context.fillRect(run.left, top, run.right - run.left, BAND_HEIGHT - 3);
      context.fillStyle = "#1c2733";
      const text = [`${word} to ${lengths.text(most, 1)}`, word].find((words) => context.measureText(words).width + 8 < run.right - run.left);
      if (text) context.fillText(text, (run.left + run.right) / 2, top + BAND_HEIGHT / 2 - 1);
    }
  }

  function paint() {
    scale.bands.forEach((name, row) => {
      const top = scale.bandTop(row);
      context.font = `11px ${FONT}`;
      context.textBaseline = "middle";
      context.textAlign = "right";
      context.fillStyle = "#4d5a66";
      context.fillText(BAND_NAMES[name], scale.left - 8, top + BAND_HEIGHT / 2 - 1);
      context.textAlign = "center";
      context.font = `600 11px ${FONT}`;
      if (name === "cutFill") cutFillBand(top);
      else coloredBand(colors.modes[name], top);
    });
  }
  return { paint };
}

function makeOverview(canvas, data, colors, scale) {
  const context = canvas.getContext("2d");
  const edge = (distance) => 1 + (distance / data.length) * (canvas.clientWidth - 2);
  return {
    distance: (x) => ((x - 1) / (canvas.clientWidth - 2)) * data.length,
    edge,
    draw(mode) {
      const ratio = window.devicePixelRatio || 1;
      const width = canvas.clientWidth;
      const height = canvas.clientHeight;
      canvas.width = Math.round(width * ratio);
      canvas.height = Math.round(height * ratio);
      context.setTransform(ratio, 0, 0, ratio, 0, 0);
      data.steps.from.forEach((from, step) => {
        context.fillStyle = mode.classes[mode.step(step)].color;
        context.fillRect(edge(from), 6, edge(data.steps.to[step]) - edge(from) + 0.5, height - 12);
      });
      context.fillStyle = "rgba(255,255,255,0.72)";
      context.fillRect(0, 6, edge(scale.from), height - 12);
      context.fillRect(edge(scale.to), 6, width - edge(scale.to), height - 12);
      context.strokeStyle = "#1c2733";
      context.lineWidth = 2;
      context.strokeRect(edge(scale.from), 2, edge(scale.to) - edge(scale.from), height - 4);
    },
  };
}
