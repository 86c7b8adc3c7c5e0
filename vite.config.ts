import { defineConfig } from "vite";

/** The pages: built into dist/pages, served by the desk, nothing fetched from anywhere else. */
export default defineConfig({
  root: "dashboards",
  base: "/",
  oxc: { jsx: { runtime: "automatic", importSource: "preact" } },
  build: {
    outDir: "../dist/pages",
    emptyOutDir: true,
    target: "es2022",
    // The content policy allows no data: scripts; everything is a file of its own.
    assetsInlineLimit: 0,
    modulePreload: false,
    reportCompressedSize: true,
  },
});
