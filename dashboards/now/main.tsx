import { render } from "preact";
import { startLive } from "./live.ts";
import { NowPage } from "./page.tsx";
import { applyLook } from "./theme.ts";

applyLook();
const page = document.getElementById("page");
if (page === null)
  throw new Error("index.html has no element with id page; wanted one to draw into");
render(<NowPage />, page);
startLive();
