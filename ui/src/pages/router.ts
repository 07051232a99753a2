// The few paths of the page. Links are plain; a click within the page does not load it anew.
import { type ReadonlySignal, signal } from "@preact/signals";

export type Route =
  | { view: "now" }
  | { view: "runs" }
  | { view: "run"; id: number }
  | { view: "bench" }
  | { view: "unknown"; path: string };

export function routeOf(path: string): Route {
  const clean = path.replace(/\/+$/, "") || "/";
  if (clean === "/") return { view: "now" };
  if (clean === "/runs") return { view: "runs" };
  if (clean === "/bench") return { view: "bench" };
  const run = /^\/runs\/([1-9]\d*)$/.exec(clean);
  return run ? { view: "run", id: Number(run[1]) } : { view: "unknown", path };
}

export interface Place { route: Route; quantity: string }

export interface Router { readonly place: ReadonlySignal<Place>; close(): void }

function here(w: Window): Place {
  return { route: routeOf(w.location.pathname), quantity: new URLSearchParams(w.location.search).get("quantity") ?? "" };
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
  w.addEventListener("popstate", look);
  w.document.addEventListener("click", click);
  return {
    place,
    close() {
      w.removeEventListener("popstate", look);
      w.document.removeEventListener("click", click);
    },
  };
}
