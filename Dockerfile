# syntax=docker/dockerfile:1
ARG BASE_IMAGE=python:3.11-slim-bookworm

FROM ${BASE_IMAGE} AS build
WORKDIR /src
COPY pyproject.toml README.md ./
COPY .ci/constraints.txt .ci/
COPY service service
# settings of the package index, where there are any, come as a secret and leave no trace
RUN --mount=type=secret,id=pip_conf,target=/etc/pip.conf,required=false \
    python3 -m venv /opt/service \
    && /opt/service/bin/pip install --no-cache-dir --constraint .ci/constraints.txt . \
    && /opt/service/bin/pip uninstall --yes pip

FROM ${BASE_IMAGE}
LABEL org.opencontainers.image.title="chance-service" \
      org.opencontainers.image.description="Exact, reproducible probability statements for digital investment advice"
COPY --from=build /opt/service /opt/service
ENV PATH=/opt/service/bin:$PATH \
    PYTHONDONTWRITEBYTECODE=1 \
    PYTHONUNBUFFERED=1 \
    OPENBLAS_NUM_THREADS=1 \
    SERVICE_BIND=0.0.0.0:8000
USER 10001:10001
WORKDIR /tmp
EXPOSE 8000
HEALTHCHECK --interval=10s --timeout=3s --start-period=10s \
    CMD ["python3", "-c", "import urllib.request; urllib.request.urlopen('http://127.0.0.1:8000/health/ready', timeout=2)"]
ENTRYPOINT ["python3", "-m", "service"]
