/**
 * The format names no encoding. Its tools write one byte a letter (ISO 8859-1, mostly), some UTF-8: a file that is valid
 * UTF-8 is read as that, any other as ISO 8859-1; one is written in ISO 8859-1 where all of its letters are in it.
 */
export function decodeDatabase(bytes: Uint8Array): string {
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch {
    return Buffer.from(bytes).toString('latin1');
  }
}

export function encodeDatabase(text: string): Uint8Array {
  for (let i = 0; i < text.length; i += 1) if (text.charCodeAt(i) > 0xff) return Buffer.from(text, 'utf8');
  return Buffer.from(text, 'latin1');
}
