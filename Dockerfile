# Ringbinder's API and worker against a PostgreSQL elsewhere (docker-compose.yml has one). For a single machine without
# Docker, `npm start` brings its own database.
ARG NODE_VERSION=22
FROM node:${NODE_VERSION}-bookworm-slim AS build
WORKDIR /app
COPY package.json package-lock.json .npmrc prisma.config.ts ./
COPY prisma prisma
RUN npm ci
COPY tsconfig.json tsconfig.build.json ./
COPY src src
COPY schema schema
COPY server server
# `npm ci` has written the database client into server/store/generated already.
RUN npm run build

FROM node:${NODE_VERSION}-bookworm-slim
ENV NODE_ENV=production HOST=0.0.0.0 PORT=8137
WORKDIR /app
COPY package.json package-lock.json .npmrc ./
# Nothing is compiled or generated here: dist holds all that was. Optional packages are the embedded database.
RUN npm ci --omit=dev --omit=optional --ignore-scripts && npm cache clean --force
COPY --from=build /app/dist dist
COPY prisma/migrations prisma/migrations
COPY schema/*.graphql schema/
COPY server/graphql/graphiql server/graphql/graphiql
COPY LICENSE ./
USER node
EXPOSE 8137
STOPSIGNAL SIGTERM
HEALTHCHECK --interval=10s --timeout=5s --start-period=30s --retries=3 CMD ["node", "dist/server/healthcheck.js"]
CMD ["node", "dist/server/api.js"]
