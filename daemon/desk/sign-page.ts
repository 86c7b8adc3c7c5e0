import { createHash } from "node:crypto";

const STYLE = `
:root{color-scheme:light dark}
body{margin:0;padding:12vh 7vw;background:#e8e0d1;color:#211b14;
font:21px/1.42 ui-serif,"Charis SIL","Noto Serif",serif}
p{max-width:34em;margin:0 0 1em}h1{font-size:31px;font-weight:400;line-height:1.2;margin:0 0 .7em}
code{font-family:ui-monospace,"DejaVu Sans Mono",monospace;font-size:.86em}
input,button{font:inherit;color:inherit;background:#fcf9f3;border:0;border-bottom:2px solid;
padding:6px 10px;min-height:44px;max-width:100%}button{background:none;cursor:pointer}
:focus-visible{outline:2.5px solid;outline-offset:3px}
@media(prefers-color-scheme:dark){body{background:#0f0a08;color:#c0977c}input{background:#221713}}
`;

/** Hash of the sign-in page's own style, for its content policy. */
export const SIGN_STYLE_HASH: string = createHash("sha256").update(STYLE).digest("base64");

const FROM_HERE = `<p>On this computer, run <code>npx --no beamsitter open</code> and open the address
it prints. It works once, within ten minutes.</p>`;

const FROM_AWAY = `<p>You come from another machine. Paste the token of this data folder; it lies in a
file on the bench's computer that only its owner can read.</p>
<form method="post" action="/sign"><label for="token">Token</label>
<input id="token" name="token" type="password" autocomplete="current-password" size="44" required>
<button>Sign in</button></form>
<p>Arming from here also needs an act at the bench: its button or its key.</p>`;

/** The plain page shown to a browser that has not signed in. `why` is one sentence of ours. */
export function signPage(why: string, away: boolean): string {
  return `<!doctype html><html lang="en"><meta charset="utf-8">
<meta name="viewport" content="width=device-width,initial-scale=1">
<link rel="icon" href="data:,"><title>beamsitter, not signed in</title><style>${STYLE}</style>
<main><h1>${why}</h1>${away ? FROM_AWAY : FROM_HERE}
<p>Dark needs no sign-in: <code>npx --no beamsitter dark</code>, or the bench's own key.</p></main></html>`;
}
