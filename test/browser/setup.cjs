module.exports = async () => {}
