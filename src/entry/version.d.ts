/** The version in package.json, put in by the build. */
declare const COUNTERPOISE_VERSION: string
