# A worker: takes simulations from any number of searches, keeps nothing. Build from the top of the repository:
#   docker build -f worker/deploy/docker/worker.Dockerfile -t skerry-worker .

FROM node:20-bookworm-slim AS build
RUN apt-get update && apt-get install -y --no-install-recommends python3 make g++ && rm -rf /var/lib/apt/lists/*
WORKDIR /app
COPY . .
RUN npm ci && npm prune --omit=dev

FROM node:20-bookworm-slim
ENV NODE_ENV=production
WORKDIR /app
COPY --from=build /app/package.json ./
COPY --from=build /app/node_modules ./node_modules
COPY --from=build /app/dist ./dist
RUN ln -s /app/dist/coordinator/cli/skerry.js /usr/local/bin/skerry
USER 10001:10001
WORKDIR /tmp
STOPSIGNAL SIGTERM
ENTRYPOINT ["skerry", "work"]
