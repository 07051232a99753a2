// Three instruments written without a line of the program they test: a supply,
// a meter and a scope that keep to IEEE 488.2 messages and SCPI-1999 nodes, with
// a grammar of their own. They listen on loopback and print their ports.
//
// The scope's and the supply's own choices (SENSe, INPut, TRACe) are those that
// the headers of standard-supply.toml, standard-meter.toml and
// standard-scope.toml promise; everything else is the standards'.
//
// As some real ones do, the supply ends its replies with CR NL, the meter sends
// them in single bytes, and the scope answers with a long header path allowed.
import { createServer } from "node:net";

// ---------------------------------------------------------------- grammar

// A node such as "VOLTage" matches its long form and its short form (the
// capitals), in either case, with a numeric suffix where the pattern ends in #.
function node(text) {
  const optional = text.startsWith("[");
  const bare = text.replace(/[[\]#]/g, "");
  const short = bare.replace(/[a-z]/g, "");
  return { optional, numbered: text.includes("#"), forms: [bare.toUpperCase(), short] };
}

function pattern(text) {
  return text.replace(/\[:?/g, ":[").replace(/^:/, "").split(":").map(node);
}

// match gives the numeric suffixes when words are spelt as a pattern says.
function match(nodes, words, at = 0, from = 0) {
  if (at === nodes.length) return from === words.length ? [] : null;
  const n = nodes[at];
  if (from < words.length) {
    const [, letters, digits] = /^(\*?[A-Z]+)(\d*)$/.exec(words[from].toUpperCase()) ?? [];
    if (n.forms.includes(letters) && (digits === "" || n.numbered)) {
      const rest = match(nodes, words, at + 1, from + 1);
      if (rest) return n.numbered ? [Number(digits || 1), ...rest] : rest;
    }
  }
  return n.optional ? match(nodes, words, at + 1, from) : null;
}

// units cuts a message at the ; outside quotes, and a unit into header and parameters.
function cut(text, separator) {
  const parts = [""];
  let quote = "";
  for (const c of text) {
    if (quote) quote = c === quote ? "" : quote;
    else if (c === '"' || c === "'") quote = c;
    if (c === separator && !quote) parts.push("");
    else parts[parts.length - 1] += c;
  }
  return parts;
}

class Fault extends Error {
  constructor(code, text) {
    super(text);
    this.code = code;
  }
}

const number = (text, least, most) => {
  if (text === undefined) throw new Fault(-109, "Missing parameter");
  if (!/^[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?$/.test(text)) throw new Fault(-104, "Data type error");
  const v = Number(text);
  if (v < least || v > most) throw new Fault(-222, "Data out of range");
  return v;
};

const word = (text, words) => {
  const w = words.find((w) => [w.toUpperCase(), w.replace(/[a-z]/g, "")].includes((text ?? "").toUpperCase()));
  if (!w) throw new Fault(text === undefined ? -109 : -224, text === undefined ? "Missing parameter" : "Illegal parameter value");
  return w.replace(/[a-z]/g, "");
};

// ---------------------------------------------------------------- instrument

class Instrument {
  errors = [];
  commands = [];
  constructor(identity) {
    this.on("*IDN?", () => identity);
    this.on("*OPC?", async () => (await this.busy, "1"));
    this.on("*CLS", () => void (this.errors = []));
    this.on("*RST", () => this.reset());
    this.on("SYSTem:ERRor[:NEXT]?", () => this.errors.shift() ?? '0,"No error"');
    this.reset();
  }
  reset() {}
  on(header, run) {
    this.commands.push({ query: header.endsWith("?"), nodes: pattern(header.replace("?", "")), run });
  }
  // setting is a number that is set and asked for.
  setting(header, name, least, most, step) {
    this.on(header, (p) => void (this[name] = Math.round(number(p[0], least, most) / step) * step));
    this.on(header + "?", () => this[name].toExponential(8));
  }
  push(fault) {
    this.errors.push(`${fault.code ?? -300},"${fault.message}"`);
    if (this.errors.length > 10) this.errors.splice(9, 2, '-350,"Queue overflow"');
  }
  // say carries out one message and gives its reply, or nothing.
  async say(message) {
    const replies = [];
    let path = [];
    for (const unit of cut(message, ";")) {
      const [, header, rest] = /^\s*(\S*)\s*(.*?)\s*$/s.exec(unit);
      if (!header) continue;
      try {
        const query = header.endsWith("?");
        const words = header.replace(/^:/, "").replace("?", "").split(":");
        const full = header.startsWith(":") || header.startsWith("*") ? words : [...path, ...words];
        const found = this.commands.map((c) => [c, match(c.nodes, full)]).find(([c, m]) => c.query === query && m);
        if (!found) throw new Fault(-113, "Undefined header");
        if (!header.startsWith("*")) path = full.slice(0, -1);
        const reply = await found[0].run(rest === "" ? [] : cut(rest, ",").map((p) => p.trim()), found[1]);
        if (query) replies.push(reply);
      } catch (fault) {
        this.push(fault);
        if (fault.code <= -100 && fault.code > -200) break;
      }
    }
    if (replies.length === 0) return null;
    return replies.length === 1 && Buffer.isBuffer(replies[0]) ? replies[0] : replies.join(";");
  }
}

const load = 100; // ohms across the supply
const world = { volts: 0, on: false };

class Supply extends Instrument {
  reset() {
    Object.assign(this, { volts: 0, amperes: 3, over: 33, tripped: false });
    world.on = false;
  }
  constructor() {
    super("GROWHOUSE,PS-30,S101,2.4");
    this.on("OUTPut[:STATe]", (p) => {
      const on = ["1", "ON"].includes(word(p[0], ["ON", "OFF", "1", "0"]));
      if (on && this.tripped) throw new Fault(-221, "Settings conflict");
      world.on = on;
    });
    this.on("OUTPut[:STATe]?", () => (world.on ? "1" : "0"));
    this.setting("[SOURce:]VOLTage[:LEVel][:IMMediate][:AMPLitude]", "volts", 0, 30, 1e-3);
    this.setting("[SOURce:]CURRent[:LEVel][:IMMediate][:AMPLitude]", "amperes", 0, 3, 1e-3);
    this.setting("[SOURce:]VOLTage:PROTection[:LEVel]", "over", 1, 33, 1e-2);
    this.on("[SOURce:]VOLTage:PROTection:TRIPped?", () => (this.tripped ? "1" : "0"));
    this.on("[SOURce:]VOLTage:PROTection:CLEar", () => void (this.tripped = false));
    this.on("MEASure[:SCALar]:VOLTage[:DC]?", () => this.terminals().toExponential(6));
    this.on("MEASure[:SCALar]:CURRent[:DC]?", () => (this.terminals() / load).toExponential(6));
    this.on("STATus:QUEStionable:CONDition?", () => String(!world.on ? 0 : this.volts > this.amperes * load ? 1 : 2));
  }
  terminals() {
    world.volts = world.on ? Math.min(this.volts, this.amperes * load) : 0;
    if (world.volts > this.over) [this.tripped, world.on, world.volts] = [true, false, 0];
    return world.volts;
  }
}

class Meter extends Instrument {
  reset() {
    Object.assign(this, { of: "VOLT", full: { VOLT: 1000, CURR: 3 }, periods: { VOLT: 10, CURR: 10 } });
  }
  constructor(supply) {
    super("GROWHOUSE,DM-6,0,1.1");
    const lists = { VOLT: [0.1, 1, 10, 100, 1000], CURR: [0.01, 0.1, 1, 3] };
    this.on("[SENSe:]FUNCtion", (p) => {
      this.of = /^["'](VOLT|CURR)(:DC)?["']$/i.exec(p[0] ?? "")?.[1].toUpperCase() ?? (() => { throw new Fault(-224, "Illegal parameter value"); })();
    });
    this.on("[SENSe:]FUNCtion?", () => `"${this.of}"`);
    for (const [short, long] of [["VOLT", "VOLTage"], ["CURR", "CURRent"]]) {
      const up = (list, v) => list.find((x) => x >= v * (1 - 1e-9)) ?? (() => { throw new Fault(-222, "Data out of range"); })();
      this.on(`[SENSe:]${long}[:DC]:RANGe[:UPPer]`, (p) => void (this.full[short] = up(lists[short], number(p[0], 0, 1000))));
      this.on(`[SENSe:]${long}[:DC]:RANGe[:UPPer]?`, () => this.full[short].toExponential(8));
      this.on(`[SENSe:]${long}[:DC]:NPLCycles`, (p) => void (this.periods[short] = up([0.02, 0.2, 1, 10, 100], number(p[0], 0, 100))));
      this.on(`[SENSe:]${long}[:DC]:NPLCycles?`, () => this.periods[short].toExponential(8));
    }
    this.on("READ?", async () => {
      await new Promise((done) => setTimeout(done, (2000 * this.periods[this.of]) / 50));
      const v = this.of === "VOLT" ? supply.terminals() / 2 : supply.terminals() / load;
      return Math.abs(v) > 1.2 * this.full[this.of] ? "9.90000000E+37" : v.toExponential(8);
    });
  }
}

// The scope sees a square wave of 1 kHz and a quarter's duty, 0 V and the supply's voltage.
class Scope extends Instrument {
  record = null;
  reset() {
    Object.assign(this, { high: {}, low: {}, factor: {}, coupling: {}, points: 1000, time: 0.01, level: 0, slope: "POS", source: "IMM", order: "SWAP", busy: null });
    this.record = null;
  }
  constructor(supply) {
    super("GROWHOUSE,OS-2,0,7.01");
    const at = ([n]) => { if (n < 1 || n > 2) throw new Fault(-114, "Header suffix out of range"); return n; };
    for (const [header, name, usual] of [["SENSe#:VOLTage:RANGe:UPPer", "high", 5], ["SENSe#:VOLTage:RANGe:LOWer", "low", -5], ["INPut#:ATTenuation", "factor", 1]]) {
      this.on(header, (p, n) => void (this[name][at(n)] = number(p[0], -1000, 1000)));
      this.on(header + "?", (p, n) => (this[name][at(n)] ?? usual).toExponential(8));
    }
    this.on("INPut#:COUPling", (p, n) => void (this.coupling[at(n)] = word(p[0], ["DC", "AC", "GND"])));
    this.on("INPut#:COUPling?", (p, n) => this.coupling[at(n)] ?? "AC");
    this.setting("SENSe:SWEep:POINts", "points", 10, 100000, 1);
    this.setting("SENSe:SWEep:TIME", "time", 1e-6, 1000, 1e-9);
    this.setting("TRIGger:LEVel", "level", -100, 100, 1e-3);
    this.on("TRIGger:SLOPe", (p) => void (this.slope = word(p[0], ["POSitive", "NEGative"])));
    this.on("TRIGger:SLOPe?", () => this.slope);
    this.on("TRIGger:SOURce", (p) => void (this.source = word(p[0], ["CH1", "CH2", "IMMediate"])));
    this.on("TRIGger:SOURce?", () => this.source);
    this.on("FORMat[:DATA]", (p) => { word(p[0], ["INTeger"]); number(p[1], 16, 16); });
    this.on("FORMat[:DATA]?", () => "INT,16");
    this.on("FORMat:BORDer", (p) => void (this.order = word(p[0], ["NORMal", "SWAPped"])));
    this.on("FORMat:BORDer?", () => this.order);
    this.on("INITiate[:IMMediate]", () => this.start(supply.terminals()));
    const recorded = () => this.record ?? (() => { throw new Fault(-230, "Data corrupt or stale"); })();
    this.on("TRACe:PREamble?", (p) => {
      const r = recorded(), n = word(p[0], ["CH1", "CH2"])[2];
      return [r.length, this.time / this.points, r.origin, (r.high(n) - r.low(n)) / 250, (r.high(n) + r.low(n)) / 2].join(",");
    });
    this.on("TRACe[:DATA]?", (p) => {
      const r = recorded(), n = word(p[0], ["CH1", "CH2"])[2], data = Buffer.alloc(2 * r.length);
      for (let i = 0; i < r.length; i++) {
        const code = Math.round(((r.volts(n, i) - (r.high(n) + r.low(n)) / 2) / (r.high(n) - r.low(n))) * 250);
        data.writeInt16BE(Math.max(-128, Math.min(127, code)), 2 * i);
      }
      const count = String(data.length);
      return Buffer.concat([Buffer.from(`#${count.length}${count}`), data]);
    });
  }
  start(volts) {
    const triggered = this.source !== "IMM" && volts > this.level;
    const origin = this.source === "IMM" ? 0 : -this.time / 10, step = this.time / this.points;
    this.record = null;
    const wave = (n, i) => (n !== "1" ? 0 : (((origin + i * step) * 1000 + 1e-9) % 1 + 1) % 1 < 0.25 ? volts : 0);
    const taken = { length: this.points, origin, volts: wave, high: (n) => this.high[n] ?? 5, low: (n) => this.low[n] ?? -5 };
    this.busy = new Promise((done) => {
      this.release = done;
      if (triggered || this.source === "IMM") setTimeout(() => { this.record = taken; done(); }, this.time * 1000);
    });
  }
  urgent(message) {
    if (message.toUpperCase() !== "ABOR") return false;
    this.release?.();
    return true;
  }
}

// ---------------------------------------------------------------- sockets

function serve(instrument, send) {
  return new Promise((ready) => {
    const server = createServer((socket) => {
      socket.setNoDelay(true);
      let rest = "", turn = Promise.resolve();
      socket.setEncoding("latin1");
      socket.on("error", () => {});
      socket.on("data", (text) => {
        const lines = (rest + text).split("\n");
        rest = lines.pop();
        for (const line of lines.map((l) => l.replace(/\r$/, ""))) {
          if (instrument.urgent?.(line)) continue;
          turn = turn.then(() => instrument.say(line)).then((reply) => reply === null || send(socket, reply));
        }
      });
    });
    server.listen(0, "127.0.0.1", () => ready(server.address().port));
  });
}

const whole = (end) => (socket, reply) => socket.write(Buffer.isBuffer(reply) ? Buffer.concat([reply, Buffer.from(end)]) : reply + end);
const singly = async (socket, reply) => {
  for (const c of reply + "\n") {
    socket.write(c);
    await new Promise((done) => setImmediate(done));
  }
};

const supply = new Supply();
const ports = { supply: await serve(supply, whole("\r\n")), meter: await serve(new Meter(supply), singly), scope: await serve(new Scope(supply), whole("\n")) };
console.log(JSON.stringify(ports));
process.stdin.on("end", () => process.exit(0)).resume(); // it ends with whoever started it
