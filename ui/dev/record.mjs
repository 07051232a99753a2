// Records a stream into the tests' fixture: node --experimental-websocket dev/record.mjs BASE_URL [POINTS] [AFTER_SEQ]
import { writeFile } from "node:fs/promises";
import { fileURLToPath } from "node:url";

const [base, want = "30", after = "-1"] = process.argv.slice(2);
const out = fileURLToPath(new URL("../src/data/fixture/night.json", import.meta.url));
const messages = [];
let points = 0, vitals = null;

const socket = new WebSocket(`${base.replace(/^http/, "ws")}/api/stream?after=${after}`);
socket.onopen = () => socket.send(JSON.stringify({ token: "" }));
socket.onmessage = async ({ data }) => {
  const m = JSON.parse(data);
  if (m.kind === "vitals") return void (vitals = m); // only the newest counts
  messages.push(m);
  if (m.entry?.kind === "point") points++;
  if (points < Number(want) || !vitals) return;
  socket.close();
  await writeFile(out, "[\n" + [...messages, vitals].map((x) => JSON.stringify(x)).join(",\n") + "\n]\n");
  console.log(`${out}: ${messages.length} messages, ${points} points`);
  process.exit(0);
};
socket.onclose = () => process.exit(1);
