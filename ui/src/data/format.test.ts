import { expect, test } from "vitest";
import { bound, clock, clockSeconds, count, date, day, duration, format, formatU, month, nbsp, ohms, setting } from "./format";

const plain = (s: string) => s.replaceAll(nbsp, " ");

// Parentheses notation: JCGM 100:2008, 7.2.2, whose example is m = 100.021 47(35) g.
test.each([
  [4.3524, 0.012, "V", "4.352(12) V"],
  [100.02147, 0.00035, "g", "100.02147(35) g"],
  [0.0521, 0.001, "A", "52.1(10) mA"],
  [21560, 110, "Ω", "21.56(11) kΩ"],
  [-0.36, 0.03, "V", "−360(30) mV"],
  [0.353, 0.002, "1", "0.3530(20)"],
  [5, 0, "V", "5 V"],
  [12.3, 1.5, "Hz", "12.3(15) Hz"],
  [NaN, 1, "V", "no value"],
  [0.0001, 0.02, "V", "0(20) mV"],
  [1234, 120, "Hz", "1.23(12) kHz"],
  [9.0, 0.0996, "V", "9.00(10) V"],
])("%d with u %d %s is %s, as the program prints it", (x, u, unit, want) => {
  expect(plain(formatU(x, u, unit))).toBe(want);
});

test.each([[4700, "Ω", "4.7 kΩ"], [0.25, "A", "250 mA"], [0, "V", "0 V"], [1e-7, "F", "100 nF"], [999.9999, "Hz", "1 kHz"], [0.5, "1", "0.5"], [21.5, "°C", "21.5 °C"], [-0.36, "V", "−360 mV"], [Infinity, "V", "no value"]])("%d %s is %s", (x, unit, want) => {
  expect(plain(format(x, unit))).toBe(want);
});

test("a number and its unit are not parted", () => {
  expect(formatU(4.3524, 0.012, "V")).toContain(nbsp + "V");
  expect(plain(bound("Settling at 9 V, 22 k; 3 of 8 repeats"))).toBe("Settling at 9 V, 22 k; 3 of 8 repeats");
  expect(bound("at 9 V, 22 k; 3 of 8 repeats in 20 ms, 1 % of 4.35(1) V")).toBe(`at 9${nbsp}V, 22${nbsp}k; 3 of 8 repeats in 20${nbsp}ms, 1${nbsp}% of 4.35(1)${nbsp}V`);
  expect(bound("9 Volts are 3 kinds")).toBe("9 Volts are 3 kinds");
});

test("settings are written as on a bench", () => {
  expect([21560, 5500, 100300, 75, 1000, 470].map((x) => plain(ohms(x)))).toEqual(["21.6 k", "5.5 k", "100 k", "75 Ω", "1 k", "470 Ω"]);
  expect(plain(setting({ supply_voltage: 9, pot_resistance: 21560 }))).toBe("9 V, 21.6 k");
  expect(plain(setting({ supply_voltage: 9, pot_resistance: 35156.25, pot_position: 90 / 256 }))).toBe("9 V, 35.2 %");
});

test("clock and calendar", () => {
  const at = "2026-11-30T22:02:07Z";
  expect([clock(at), clockSeconds(at), day(at), month(at), date(at)]).toEqual(["22:02", "22:02:07", "Mon 30", "November 2026", "30 November 2026, 22:02"]);
});

test("lengths of time are as rough as they are known", () => {
  expect([3, 42, 90, 700, 3600, 5400, 16000, 7200, -5].map((s) => plain(duration(s)))).toEqual(["3 s", "45 s", "2 min", "12 min", "1 h", "1 h 30 min", "4 h 30 min", "2 h", "0 s"]);
  expect([count(1, "point"), count(0, "point")]).toEqual(["1 point", "0 points"]);
});
