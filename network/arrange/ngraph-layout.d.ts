/** Types of the ready-made two-dimensional build of ngraph.forcelayout, which ships none: what map.ts uses of it. */
declare module 'ngraph.forcelayout/dist/ngraph.forcelayout2d.js' {
  import type { Graph, NodeId } from 'ngraph.graph';

  interface PlaneLayout {
    step(): boolean;
    setNodePosition(id: NodeId, x: number, y: number): void;
    getNodePosition(id: NodeId): { x: number; y: number };
    dispose(): void;
  }

  interface PlaneSettings {
    readonly theta: number;
    readonly timeStep: number;
    readonly springCoefficient: number;
    readonly gravity: number;
    readonly dragCoefficient: number;
    readonly nodeMass: (id: NodeId) => number;
  }

  export default function createLayout(graph: Graph, settings: PlaneSettings): PlaneLayout;
}
