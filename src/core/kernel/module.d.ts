/** AssemblyScript sources import as the bytes of the WebAssembly module they compile to. */
declare module '*.as' {
  const bytes: Uint8Array
  export default bytes
}
