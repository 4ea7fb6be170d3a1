import { createHash } from 'node:crypto';
import type { ServerResponse } from 'node:http';

const style =
  ':root{color-scheme:light dark}body{font:1.1rem/1.5 system-ui,sans-serif;max-width:32rem;margin:12vh auto;padding:0 1.5rem}' +
  'label{display:block;font-weight:600}input,button{font:inherit;padding:.5rem .75rem;margin:.5rem 0}input{width:100%;box-sizing:border-box}';
const styleHash = createHash('sha256').update(style).digest('base64');

/** The page that asks for the token. No script; its one style sheet is allowed by its hash. */
export function signInPage(response: ServerResponse, status: number, remark: string): void {
  const policy = String(response.getHeader('Content-Security-Policy')).replace(
    "style-src 'self'",
    `style-src 'sha256-${styleHash}'`,
  );
  response.setHeader('Content-Security-Policy', policy);
  response.writeHead(status, { 'Content-Type': 'text/html; charset=utf-8', 'Cache-Control': 'no-store' });
  response.end(
    `<!doctype html><html lang="en"><head><meta charset="utf-8"><meta name="viewport" content="width=device-width,initial-scale=1">` +
      `<title>Token for the live view</title><style>${style}</style></head><body><main><h1>oilspring live view</h1>` +
      `<p>This bench is reachable from other machines. The token stands where the bench was started.</p>` +
      (remark === '' ? '' : `<p role="alert"><strong>${remark}</strong></p>`) +
      `<form method="post" action="/token"><label for="token">Token</label>` +
      `<input id="token" name="token" type="password" autocomplete="off" required maxlength="256"><button>Open the live view</button></form>` +
      `<p>The connection is not encrypted: use it in a network that you trust.</p></main></body></html>`,
  );
}
