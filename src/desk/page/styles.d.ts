/** Style sheets are put into the page by the build; importing one has no value. */
declare module '*.css'
