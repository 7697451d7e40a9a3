// Round numbers along axes.

const power10 = (k) => Number(`1e${k}`);

/** Multiples of 1, 2 or 5 times a power of ten, at most about `most`. */
const linearTicks = (from, to, most) => {
  const span = to - from;
  if (!(span > 0) || !Number.isFinite(span)) return [from];
  const raw = span / Math.max(most, 1);
  let power = Math.floor(Math.log10(raw));
  let factor = [1, 2, 5].find((f) => f * power10(power) >= raw * (1 - 1e-9));
  if (!factor) {
    factor = 1;
    power += 1;
  }
  // dividing keeps decimals such as 0.3 the nearest number
  const at = (k) => (power < 0 ? (k * factor) / power10(-power) : k * factor * power10(power));
  const step = at(1);
  const ticks = [];
  for (let k = Math.ceil(from / step - 1e-9); k <= to / step + 1e-9 && ticks.length < 200; k += 1) ticks.push(at(k) + 0);
  return ticks;
};

/** Labels of linear ticks: plain decimals, or a common power of ten where the numbers are very large or small. */
const linearLabels = (ticks) => {
  const largest = Math.max(...ticks.map(Math.abs), 0);
  if (largest === 0) return ticks.map(() => "0");
  const power = Math.floor(Math.log10(largest) + 1e-12);
  const step = ticks.length > 1 ? Math.abs(ticks[1] - ticks[0]) : largest;
  const decimals = (unit) => {
    const lowest = Math.floor(Math.log10(step / unit) + 1e-9);
    return Math.min(Math.max(-lowest, 0), 12);
  };
  const minus = (text) => text.replace("-", "\u2212");
  if (power >= -3 && power < 5) return ticks.map((tick) => minus((tick + 0).toFixed(decimals(1))));
  const unit = power10(power);
  return ticks.map((tick) =>
    tick === 0 ? "0" : minus((tick / unit).toFixed(decimals(unit))) + `\u00d710${raise(power)}`);
};

/** Powers of ten with labels, and the whole numbers between them where there are few. */
const logTicks = (from, to, most) => {
  const first = Math.ceil(Math.log10(from) - 1e-9);
  const last = Math.floor(Math.log10(to) + 1e-9);
  const decades = last - first + 1;
  if (decades < 2) {
    // less than two powers of ten: round numbers, as on a linear axis
    const ticks = linearTicks(from, to, most).filter((tick) => tick > 0);
    return { ticks, labels: linearLabels(ticks) };
  }
  const stride = [1, 2, 3, 5, 10, 20, 50, 100].find((s) => decades / s <= most) || 200;
  const ticks = [];
  const labels = [];
  for (let k = first - 1; k <= last; k += 1) {
    const major = k >= first && ((k % stride) + stride) % stride === 0;
    if (k >= first) {
      ticks.push(power10(k));
      labels.push(major ? `10${raise(k)}` : "");
    }
    if (stride === 1 && decades <= 5) {
      for (let m = 2; m < 10; m += 1) {
        const tick = Number(`${m}e${k}`);
        if (tick >= from && tick <= to) {
          ticks.push(tick);
          labels.push("");
        }
      }
    }
  }
  return { ticks, labels };
};

/** Ticks and labels of an axis. */
const ticksOf = (log, from, to, most) => {
  if (log) return logTicks(from, to, most);
  const ticks = linearTicks(from, to, most);
  return { ticks, labels: linearLabels(ticks) };
};
