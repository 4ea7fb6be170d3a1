// Lets a child process or worker of a test run the project's TypeScript: `node --import tests/support/typescript-hooks.mjs x.ts`.
// Types are stripped by the compiler's transpileModule; imports of ours end in .js and are looked up as .ts.
import { register } from 'node:module';

register(new URL('./typescript-loader.mjs', import.meta.url));
