// Chainage labels. Distance runs on without a jump; the label may jump at a chainage equation.

function makeChainage(format, length) {
  const { breaks, perMeter, digits } = format; // breaks: [distance, chainage value], meters
  const base = 10 ** digits;

  function segmentAt(distance) {
    let found = 0;
    while (found + 1 < breaks.length && breaks[found + 1][0] <= distance) found += 1;
    return found;
  }

  function label(value, decimals) {
    // Rounded before it is split, so that 999.97 becomes 1+000.0 and not 0+1000.0.
    const scale = 10 ** decimals;
    const whole = Math.round(Math.abs(value) * perMeter * scale);
    const large = Math.floor(whole / (base * scale));
    const small = whole / scale - large * base;
    const text = small.toFixed(decimals).padStart(digits + (decimals ? decimals + 1 : 0), "0");
    const trimmed = decimals ? text.replace(/\.?0+$/, (tail) => (tail.startsWith(".") ? "" : tail.replace(/0+$/, ""))) : text;
    return `${value < 0 && whole ? "−" : ""}${large}+${trimmed}`;
  }

  function text(distance, decimals = 1) {
    const [at, value] = breaks[segmentAt(distance)];
    return label(value + distance - at, decimals);
  }

  function typedValue(typed) {
    const match = /^\s*(-|−)?(?:(\d+)\s*\+\s*)?(\d+(?:\.\d*)?)\s*$/.exec(typed);
    if (!match) return null;
    const size = (match[2] ? Number(match[2]) * base : 0) + Number(match[3]);
    return ((match[1] ? -1 : 1) * size) / perMeter;
  }

  // A label can stand twice where an equation runs back: every place that carries it is returned.
  function distances(typed) {
    const value = typedValue(typed);
    const found = [];
    if (value === null) return found;
    breaks.forEach(([at, start], i) => {
      const end = i + 1 < breaks.length ? breaks[i + 1][0] : length;
      const distance = at + value - start;
      if (distance >= at - 0.05 && distance <= end + 0.05) found.push(Math.min(Math.max(distance, 0), length));
    });
    return found;
  }

  // The equation that swallows a typed chainage, in words; null where none does.
  function swallowedBy(typed) {
    const value = typedValue(typed);
    for (let i = 1; value !== null && i < breaks.length; i += 1) {
      const back = breaks[i - 1][1] + breaks[i][0] - breaks[i - 1][0];
      if (value > back && value < breaks[i][1]) return `${label(back, 1)} = ${label(breaks[i][1], 1)}`;
    }
    return null;
  }

  // Pegs at round chainages between two distances, one list for the plan and the profile.
  function ticks(from, to, spacing) {
    const found = [];
    breaks.forEach(([at, start], i) => {
      const end = Math.min(i + 1 < breaks.length ? breaks[i + 1][0] : length, to);
      const first = Math.ceil((start + Math.max(from - at, 0) - 1e-6) / spacing) * spacing;
      for (let value = first; at + value - start <= end + 1e-6; value += spacing) {
        found.push({ distance: at + value - start, text: label(value, 0) });
      }
    });
    return found;
  }

  // The least round spacing, in meters, that is not below `least`.
  function spacing(least) {
    const wanted = least * perMeter;
    const power = 10 ** Math.floor(Math.log10(wanted));
    const factor = [1, 2, 5, 10].find((k) => k * power >= wanted);
    return Math.max(factor * power, 1) / perMeter;
  }

  return { text, distances, swallowedBy, ticks, spacing, equations: breaks.slice(1).map(([at]) => at), base };
}
