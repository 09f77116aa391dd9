// Style sheets carry no meaning outside a browser.
module.exports = {}
