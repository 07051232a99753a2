// @vitest-environment happy-dom
// The edges: the token, the requests, the paths.
import { beforeEach, expect, test, vi } from "vitest";
import { takeToken } from "./access";
import { Failure, newClient } from "./client";
import { newRouter, routeOf } from "../pages/router";

beforeEach(() => {
  sessionStorage.clear();
  history.replaceState(null, "", "/");
});

test("the token leaves the address bar at once and lasts for the tab", () => {
  history.replaceState(null, "", "/runs?quantity=duty#token=abc_-1");
  expect(takeToken()).toBe("abc_-1");
  expect(location.href).not.toContain("abc");
  expect(location.pathname + location.search).toBe("/runs?quantity=duty");
  expect(takeToken()).toBe("abc_-1");
});

test("without a token the page watches", () => {
  expect(takeToken()).toBe("");
});

function answering(status: number, body: unknown) {
  return vi.fn<typeof fetch>(async () => new Response(JSON.stringify(body), { status }));
}

test("the token goes in a header, and only there", async () => {
  const fetcher = answering(200, { runs: [] });
  expect(await newClient("secret", fetcher).runs()).toEqual([]);
  const [path, init] = fetcher.mock.calls[0]!;
  expect(String(path)).not.toContain("secret");
  expect(new Headers(init!.headers).get("Authorization")).toBe("Bearer secret");
  await newClient("", fetcher).runs();
  expect(new Headers(fetcher.mock.calls[1]![1]!.headers).has("Authorization")).toBe(false);
});

test("a problem document's detail is what is said", async () => {
  const denied = newClient("", answering(403, { title: "Forbidden", detail: "only the operator may switch off" }));
  await expect(denied.off()).rejects.toThrow("only the operator may switch off");
  await expect(newClient("", answering(500, "oops")).bench()).rejects.toThrow("/api/bench answered with status 500.");
  const silent = newClient("", async () => Promise.reject(new TypeError("failed to fetch")));
  await expect(silent.runs()).rejects.toEqual(new Failure(0, "The daemon did not answer."));
});

test("no record kept is not a failure", async () => {
  expect(await newClient("", answering(404, { detail: "no record" })).record(41)).toBeNull();
  await expect(newClient("", answering(500, {})).record(41)).rejects.toThrow();
});

test.each([["/", { view: "now" }], ["/runs/", { view: "runs" }], ["/runs", { view: "runs" }], ["/runs/41", { view: "run", id: 41 }], ["/runs/041", { view: "unknown", path: "/runs/041" }], ["/runs/x", { view: "unknown", path: "/runs/x" }], ["/bench", { view: "bench" }], ["/boards", { view: "boards", hash: "" }], ["/boards/" + "0a".repeat(32), { view: "boards", hash: "0a".repeat(32) }], ["/boards/0A", { view: "unknown", path: "/boards/0A" }], ["/morning", { view: "unknown", path: "/morning" }]])("%s leads to its view", (path, want) => {
  expect(routeOf(path)).toEqual(want);
});

test("a link within the page is followed without loading; one that asks for more is left alone", () => {
  const router = newRouter();
  document.body.innerHTML = '<a id="in" href="/runs/41?quantity=duty">in</a><a id="out" href="https://example.org/">out</a>';
  const click = (id: string, more: MouseEventInit = {}) => document.getElementById(id)!.dispatchEvent(new MouseEvent("click", { bubbles: true, cancelable: true, button: 0, ...more }));
  expect(click("in", { ctrlKey: true })).toBe(true);
  expect(click("out")).toBe(true);
  expect(router.place.value.route).toEqual({ view: "now" });
  expect(click("in")).toBe(false);
  expect(router.place.value).toMatchObject({ route: { view: "run", id: 41 }, quantity: "duty" });
  router.close();
});

test("a form that only asks is followed like a link, what was left empty left out", () => {
  const router = newRouter();
  document.body.innerHTML = '<form action="/boards" method="get"><input name="supply" value=" 9 "><input name="pot" value=""></form>';
  const form = document.querySelector("form")!;
  expect(form.dispatchEvent(new Event("submit", { bubbles: true, cancelable: true }))).toBe(false);
  expect(location.pathname + location.search).toBe("/boards?supply=9");
  expect(router.place.value).toEqual({ route: { view: "boards", hash: "" }, quantity: "", at: { supply: "9", pot: "", temperature: "" } });
  router.close();
});

test("a board is asked for at the setting given, the rest left to the daemon", async () => {
  const fetcher = answering(200, {});
  await newClient("", fetcher).board("ab", { supply: 9, pot: undefined, temperature: -10 });
  expect(fetcher.mock.calls[0]![0]).toBe("/api/boards/ab?supply=9&temperature=-10");
  await newClient("", fetcher).board("ab", {});
  expect(fetcher.mock.calls[1]![0]).toBe("/api/boards/ab");
});
