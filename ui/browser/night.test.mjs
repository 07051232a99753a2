// Drives a real browser against a running daemon: open, see points arrive, reload, press
// Outputs off, see the run stopped and the bench safe. BASE_URL and TOKEN name a daemon;
// without them the practice bench is started: go build -o nightbench ./daemon first.
import assert from "node:assert/strict";
import { readFile } from "node:fs/promises";
import { createRequire } from "node:module";
import { after, before, test } from "node:test";
import { aDaemon, openBrowser } from "../scripts/browser.mjs";

const soon = { timeout: 60_000 };
let daemon, browser, context;

before(async () => {
  daemon = await aDaemon();
  browser = await openBrowser();
  context = await browser.newContext({ viewport: { width: 1440, height: 900 } });
});
after(async () => {
  await browser?.close();
  await daemon?.close();
});

/** A page that fails the test when it complains: an error, or a breach of the content policy. */
async function open(path, token, where = context) {
  const page = await where.newPage();
  page.trouble = [];
  page.on("pageerror", (e) => page.trouble.push(e.message));
  page.on("console", (m) => m.type() === "error" && page.trouble.push(m.text()));
  page.on("request", (r) => !r.url().startsWith(daemon.base) && page.trouble.push(`loads ${r.url()}`));
  await page.goto(`${daemon.base}${path}${token ? `#token=${token}` : ""}`);
  return page;
}

const dots = (page) => page.locator("main figure .dots circle").count();
const standing = (page) => page.locator(".standing .say p").first();

async function moreDots(page, than) {
  await page.waitForFunction((n) => document.querySelectorAll("main figure .dots circle").length > n, than, soon);
  return dots(page);
}

let page;

test("opens with the state, the pace, and no token left in the address bar", soon, async () => {
  page = await open("/", daemon.token);
  await page.getByText(/^Energised\./).first().waitFor(soon);
  assert.equal(page.url(), `${daemon.base}/`);
  assert.match(await page.locator(".run-head .pace").textContent(), /Practice bench/);
  assert.equal(await page.locator("h1").count(), 1);
});

test("points arrive by themselves, on predicted curves", soon, async () => {
  const first = await moreDots(page, 0);
  await moreDots(page, first);
  assert.ok((await page.locator("main figure .pencil").count()) >= 2);
});

test("a watcher in another window sees the points too, and is told why the button can't act", soon, async () => {
  const elsewhere = await browser.newContext({ viewport: { width: 390, height: 844 } });
  const watcher = await open("/", "", elsewhere);
  await moreDots(watcher, 0);
  await watcher.getByRole("button", { name: "Outputs off" }).click({ force: true });
  await watcher.locator(".outcome").filter({ hasText: "no operator’s token" }).waitFor(soon);
  const wide = await watcher.evaluate(() => document.documentElement.scrollWidth);
  assert.ok(wide <= 390, `the page is ${wide} px wide on a phone`);
  assert.deepEqual(watcher.trouble, []);
  await elsewhere.close();
});

test("a reload has every point again, and the token still", soon, async () => {
  const had = await dots(page);
  await page.reload();
  await moreDots(page, had - 1);
  assert.equal(await page.getByRole("button", { name: "Outputs off" }).getAttribute("aria-disabled"), null);
});

test("a cut line is said, and mended by itself with nothing lost or doubled", soon, async () => {
  const cut = await context.newPage();
  const lines = [];
  let broken = false;
  await cut.routeWebSocket(/\/api\/stream/, (line) => {
    lines.push(line.url());
    if (broken) return void line.close();
    const server = line.connectToServer();
    line.onMessage((m) => server.send(m));
    server.onMessage((m) => (broken ? line.close() : line.send(m)));
  });
  await cut.goto(daemon.base);
  await moreDots(cut, 0);
  broken = true;
  await cut.getByText(/^Not live since/).first().waitFor(soon);
  await cut.locator(".sheet.stale").waitFor(soon);
  const had = await dots(cut);
  broken = false;
  await cut.locator(".sheet:not(.stale)").waitFor(soon);
  await moreDots(cut, had);
  assert.match(lines[0], /after=-1$/);
  assert.match(lines[lines.length - 1], /after=[1-9]\d*$/);
  const drawn = await cut.locator("details.behind").evaluate(async (d) => {
    d.open = true;
    await new Promise((r) => setTimeout(r, 200));
    return [...d.querySelectorAll("tbody tr")].map((r) => [...r.cells].slice(0, 3).map((c) => c.textContent).join(" ")).filter((s) => !s.includes("recheck"));
  });
  assert.equal(new Set(drawn).size, drawn.length, "a point stands twice");
  await cut.close();
});

test("the other views have the same standing lines", soon, async () => {
  for (const [name, heading] of [["Runs", /Nights/], ["Bench", /wired/], ["Boards", /board/i], ["Now", /./]]) {
    await page.getByRole("navigation", { name: "Views" }).getByRole("link", { name }).click();
    await page.locator("h1").filter({ hasText: heading }).waitFor(soon);
    await standing(page).getByText("Energised.").waitFor(soon);
    assert.ok(await page.getByRole("button", { name: "Outputs off" }).isVisible());
  }
});

test("the board of the run is drawn and predicted, and computed where the form says", soon, async () => {
  const board = await open("/boards", "");
  await board.locator("main svg.staff").waitFor(soon);
  assert.match(await board.locator("h1").textContent(), /oscillates at every setting/);
  assert.ok((await board.locator("main figure .pencil").count()) >= 2);
  await board.getByLabel("pot, Ω").fill("33k");
  await board.getByRole("button", { name: "Compute there" }).press("Enter");
  await board.locator("h2").filter({ hasText: /^At .*33.k/ }).waitFor(soon);
  assert.match(board.url(), /pot=33k/);
  await board.setViewportSize({ width: 390, height: 844 });
  const wide = await board.evaluate(() => document.documentElement.scrollWidth);
  assert.ok(wide <= 390, `the page is ${wide} px wide on a phone`);
  assert.deepEqual(board.trouble, []);
  await board.close();
});

test("Outputs off asks nothing, ends the run and leaves the bench safe", soon, async () => {
  const id = await runId();
  await page.getByRole("button", { name: "Outputs off" }).click();
  await page.locator(".outcome").filter({ hasText: "Off confirmed" }).waitFor(soon);
  await standing(page).getByText("Not energised.").waitFor(soon);
  const { run } = await (await fetch(`${daemon.base}/api/runs/${id}`)).json();
  assert.equal(run.state, "stopped");
  const { vitals } = await (await fetch(`${daemon.base}/api/status`)).json();
  assert.equal(vitals.energised, "no");
  assert.ok(vitals.confirmed_by.length > 0, "off without a witness");
  await page.locator("h1").filter({ hasText: `Run ${id} was stopped` }).waitFor(soon);
});

test("no barrier on any view, in both lights, contrast included", soon, async () => {
  const axe = await readFile(createRequire(import.meta.url).resolve("axe-core/axe.min.js"), "utf8");
  for (const colorScheme of ["light", "dark"])
    for (const path of ["/", "/runs", `/runs/${await runId()}`, "/bench", "/boards"]) {
      const view = await browser.newPage({ colorScheme, viewport: { width: 1440, height: 900 } });
      await view.goto(daemon.base + path);
      await view.locator(".standing strong").filter({ hasText: /energised|Energised/ }).waitFor(soon);
      if (path === "/boards") await view.locator("main svg.staff").waitFor(soon);
      await view.evaluate(axe);
      const found = await view.evaluate(async () => (await window.axe.run(document)).violations.map((v) => `${v.id}: ${v.nodes.map((n) => n.html).join(" ")}`));
      assert.deepEqual(found, [], `${path} in ${colorScheme}`);
      await view.close();
    }
});

test("nothing complained: no error, no breach of the policy, nothing loaded from elsewhere", () => {
  assert.deepEqual(page.trouble, []);
});

async function runId() {
  const { runs } = await (await fetch(`${daemon.base}/api/runs`)).json();
  return runs[0].id;
}
