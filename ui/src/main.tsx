import { render } from "preact";
import { takeToken } from "./data/access";
import { newBench } from "./data/bench";
import { newClient } from "./data/client";
import { newRouter } from "./pages/router";
import { Page } from "./pages/page";

const token = takeToken();
const client = newClient(token);
const bench = newBench(client, token);
const wake = () => document.visibilityState === "visible" && bench.wake();
document.addEventListener("visibilitychange", wake);
window.addEventListener("online", wake);
render(<Page bench={bench} client={client} router={newRouter()} />, document.getElementById("page")!);
