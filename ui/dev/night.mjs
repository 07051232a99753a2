// Makes up a night for looking at the page without a bench: entries as the journal would hold them.
// Textbook timing (t = 0.693 R C, steering diodes left out) and a motor on its back-EMF, with noise.
// A bench records better ones: see record.mjs.

const pots = [1.2, 1.8, 2.7, 3.9, 5.5, 8.2, 12, 18, 27, 39, 56, 82].map((k) => k * 1000);
const supplies = [5, 9, 12];
const R = 10e3, C = 100e-9;

let seed = 7;
const random = () => ((seed = (seed * 1664525 + 1013904223) % 2 ** 32) / 2 ** 32);
const noise = (s) => s * (random() + random() + random() + random() - 2) * 1.73;

/** The quantities at a setting: value, and the half-width of its 95 % band. */
function expected(supply, pot) {
  const high = 0.693 * R * C * (1 + 0.9 / supply), low = 0.693 * (pot + 470) * C * (1 + 0.9 / supply);
  const duty = high / (high + low);
  const drive = Math.max(0, supply * (0.35 + 0.65 * duty) * (1 - (1 - duty) ** 2 * 0.55) - 0.35);
  const average = Math.min(supply - 0.3, drive);
  return {
    duty: [duty, 0.012, "1"],
    frequency: [1 / (high + low), 0.06 / (high + low), "Hz"],
    average_voltage: [average, 0.03 * supply * (0.6 + 0.4 * duty), "V"],
    output_drop: [0.18 + 0.02 * supply + 0.05 * duty, 0.06, "V"],
    motor_current: [0.02 + 0.012 * average, 0.004, "A"],
    supply_current: [0.012 + duty * (0.02 + 0.012 * average), 0.003, "A"],
  };
}
const us = { duty: 0.0021, frequency: 1.1, average_voltage: 0.03, output_drop: 0.021, motor_current: 0.0007, supply_current: 0.0005 };
const roads = { average_voltage: "meter average", motor_current: "meter motor", supply_current: "supply" };

export function curves() {
  const pot = Array.from({ length: 61 }, (_, i) => 1000 * 100 ** (i / 60));
  return supplies.map((supply_voltage) => {
    const quantities = {};
    for (const p of pot) for (const [q, [v, w, unit]] of Object.entries(expected(supply_voltage, p))) {
      const c = (quantities[q] ??= { unit, value: [], low: [], high: [] });
      c.value.push(round(v)); c.low.push(round(v - w)); c.high.push(round(v + w));
    }
    return { supply_voltage, pot_resistance: pot.map(round), quantities };
  });
}

export function setpoints() {
  const out = [];
  supplies.forEach((supply_voltage, k) => ["up", "down"].forEach((direction, j) => {
    const order = direction === "up" ? pots : [...pots].reverse();
    for (const pot of order) {
      const pot_code = Math.round(((pot - 75) / 1e5) * 256);
      out.push({ index: out.length, supply_voltage, pot_code, pot_resistance: round((pot_code * 1e5) / 256 + 75), direction, pass: 2 * k + j });
    }
  }));
  return out;
}

const flagsAt = {
  10: ["average_voltage", { name: "unsettled", words: "still moving by 1.6 % after 20 s; the rotor is near stall" }],
  13: ["average_voltage", { name: "unsettled", words: "still moving by 2.1 % after 20 s; the rotor is near stall" }],
  28: ["average_voltage", { name: "roads disagree", words: "meter and scope differ by 3.6 u; aperture against period is likely" }],
};

export function point(s, at, elapsed) {
  const e = expected(s.supply_voltage, s.pot_resistance);
  const predictions = {}, readings = [];
  for (const [q, [v, w, unit]] of Object.entries(e)) {
    predictions[q] = { value: round(v), low: round(v - w), high: round(v + w), unit };
    const u = us[q] * (0.8 + 0.4 * random());
    const flag = flagsAt[s.index]?.[0] === q ? [flagsAt[s.index][1]] : [];
    readings.push({ quantity: q, value: round(v + noise(0.3 * w) + noise(0.5 * u) - (flag.length ? 1.1 * w : 0)), u: round(flag.length ? 4 * u : u), dof: 12, unit, road: roads[q] ?? "scope ch 1", flags: flag });
  }
  return { setpoint: s, at, elapsed, readings, predictions, flags: [] };
}

/** A raw record of the load: driven, freewheel, rest. */
export function record(p) {
  const f = p.readings.find((r) => r.quantity === "frequency").value, d = p.readings.find((r) => r.quantity === "duty").value;
  const n = 6000, span = 12 / f, vcc = p.setpoint.supply_voltage, rest = vcc * 0.55, codes = [];
  for (let i = 0; i < n; i++) {
    const t = (((i / n) * span * f + 0.4) % 1 + 1) % 1;
    const v = t < d ? vcc - 0.1 : t < d + 0.1 ? -0.36 : rest - (rest + 0.36) * Math.exp(-(t - d - 0.1) / 0.02);
    codes.push(Math.max(-127, Math.min(127, Math.round((v + noise(0.02) - 5) / 0.06))));
  }
  return { node: "load_hi less load_lo", channel: 1, start: 0, interval: span / n, volts_per_code: 0.06, volts_at_zero: 5, codes };
}

function round(x) { return Number(x.toPrecision(6)); }
