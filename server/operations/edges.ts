/** From one record to another by the bare id it carries: the same rights as at any other door. */
import { may } from '../auth/index.ts';
import type { Context } from './context.ts';
import type { Operations } from './operations.ts';

type EdgeOperations = Pick<Operations, 'chipById' | 'revisionById' | 'configurationById' | 'versionById'>;

export function edgeOperations(context: Context): EdgeOperations {
  const { store } = context;
  return {
    async chipById(viewer, id) {
      return may(viewer, 'chip.read') ? store.findChipById(id) : null;
    },
    async revisionById(viewer, id) {
      return may(viewer, 'chip.read') ? context.revisionById(id) : null;
    },
    async configurationById(viewer, id) {
      return may(viewer, 'configuration.read') ? store.findConfigurationById(id) : null;
    },
    async versionById(viewer, id) {
      return may(viewer, 'configuration.read') ? store.findVersionById(id) : null;
    },
  };
}
