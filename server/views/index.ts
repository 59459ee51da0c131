/** From records to what crosses the wire; member names are those of the GraphQL schema. */
export { chipModelView, chipView, revisionView } from './chip.ts';
export { type CurveOrigin, responseCsv, responseJson, touchstone } from './curve.ts';
export {
  circuitView,
  complianceView,
  designView,
  requestView,
  settingView,
  transferFunctionView,
} from './design.ts';
export { configurationView, releaseView, versionView } from './library.ts';
export { actorView, historyView, tokenView, viewerView } from './people.ts';
export {
  designSheet,
  releaseSheet,
  type SettingSheet,
  settingSheetCsv,
  settingSheetJson,
  versionSheet,
} from './setting-sheet.ts';
export { type FilterSpecificationView, specificationView } from './specification.ts';
