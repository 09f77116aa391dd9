/** Where the host's own script comes from: the only thing the add-in loads that it does not bring itself. */
const officeHost = 'https://appsforoffice.microsoft.com'

/**
 * The content security policy of a page, for its meta element: nothing leaves the machine. WebAssembly needs
 * 'wasm-unsafe-eval'; the styles that Fluent UI writes at run time need 'unsafe-inline'.
 */
function contentSecurityPolicy(page) {
  const scripts = page === 'taskpane' ? ` ${officeHost}` : ''
  return [
    "default-src 'none'",
    `script-src 'self' 'wasm-unsafe-eval'${scripts}`,
    "style-src 'self' 'unsafe-inline'",
    "img-src 'self' data: blob:",
    "font-src 'self' data:",
    "connect-src 'self'",
    "worker-src 'self'",
    "frame-src 'self'",
    "base-uri 'none'",
    "form-action 'none'",
  ].join('; ')
}

module.exports = { contentSecurityPolicy, officeHost }
