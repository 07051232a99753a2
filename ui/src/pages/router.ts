// The few paths of the page. Links are plain; a click within the page does not load it anew.
import { type ReadonlySignal, signal } from "@preact/signals";

export type Route =
  | { view: "now" }
  | { view: "runs" }
  | { view: "run"; id: number }
  | { view: "bench" }
  | { view: "boards"; hash: string }
  | { view: "unknown"; path: string };

export function routeOf(path: string): Route {
  const clean = path.replace(/\/+$/, "") || "/";
  if (clean === "/") return { view: "now" };
  if (clean === "/runs") return { view: "runs" };
  if (clean === "/bench") return { view: "bench" };
  if (clean === "/boards") return { view: "boards", hash: "" };
  const board = /^\/boards\/([0-9a-f]{64})$/.exec(clean);
  if (board) return { view: "boards", hash: board[1]! };
  const run = /^\/runs\/([1-9]\d*)$/.exec(clean);
  return run ? { view: "run", id: Number(run[1]) } : { view: "unknown", path };
}

/** Where a board is looked at, as typed: "9 V", "33k", "27". Empty: left to the daemon. */
export interface At { supply: string; pot: string; temperature: string }

export interface Place { route: Route; quantity: string; at: At }

export interface Router { readonly place: ReadonlySignal<Place>; close(): void }

function here(w: Window): Place {
  const q = new URLSearchParams(w.location.search);
  const said = (name: string) => q.get(name)?.trim() ?? "";
  return { route: routeOf(w.location.pathname), quantity: said("quantity"), at: { supply: said("supply"), pot: said("pot"), temperature: said("temperature") } };
}

export function newRouter(w: Window = window): Router {
  const place = signal<Place>(here(w));
  const look = () => (place.value = here(w));
  const click = (e: MouseEvent) => {
    const a = (e.target as Element | null)?.closest?.("a");
    if (!a || e.defaultPrevented || e.button !== 0 || e.metaKey || e.ctrlKey || e.shiftKey || e.altKey) return;
    if (a.target || a.origin !== w.location.origin || a.hash) return;
    e.preventDefault();
    const sameView = a.pathname === w.location.pathname;
    w.history[sameView ? "replaceState" : "pushState"](null, "", a.pathname + a.search);
    look();
    if (!sameView) {
      w.scrollTo(0, 0);
      // After the new view is there, its heading is where a reader goes on.
      setTimeout(() => w.document.querySelector<HTMLElement>("h1")?.focus({ preventScroll: true }));
    }
  };
  // A form that only asks (method get) is a link whose end is typed in.
  const submit = (e: SubmitEvent) => {
    const f = e.target as HTMLFormElement;
    if (e.defaultPrevented || f.method !== "get") return;
    e.preventDefault();
    const q = new URLSearchParams();
    new FormData(f).forEach((v, k) => typeof v === "string" && v.trim() && q.set(k, v.trim()));
    w.history.pushState(null, "", new URL(f.action, w.location.href).pathname + (q.size ? `?${q}` : ""));
    look();
  };
  w.addEventListener("popstate", look);
  w.document.addEventListener("click", click);
  w.document.addEventListener("submit", submit);
  return {
    place,
    close() {
      w.removeEventListener("popstate", look);
      w.document.removeEventListener("click", click);
      w.document.removeEventListener("submit", submit);
    },
  };
}
