using System.Collections.Immutable;

namespace PanelChoice.Study;

/// <summary>
/// The nest tree over the study's alternatives. Children are numbered in one row: alternatives are 0 to J - 1, and the inner node
/// with index n in <see cref="Nodes"/> is J + n. Every child stands before its parent; the root is the last node.
/// </summary>
/// <param name="Alternatives">Names of the J alternatives.</param>
/// <param name="Nodes">Inner nodes, children before parents, root last.</param>
public sealed record NestTree(ImmutableArray<string> Alternatives, ImmutableArray<NestNode> Nodes)
{
    /// <summary>Index of the root in <see cref="Nodes"/>.</summary>
    public int Root => Nodes.Length - 1;

    /// <summary>Whether the child number means an alternative rather than an inner node.</summary>
    public bool IsAlternative(int child) => child < Alternatives.Length;

    /// <summary>Index in <see cref="Nodes"/> of the inner node that lists the given child (alternative, or J + node).</summary>
    /// <exception cref="ArgumentOutOfRangeException">The root, or no such child.</exception>
    public int ParentOf(int child)
    {
        for (var n = 0; n < Nodes.Length; n++)
            if (Nodes[n].Children.Contains(child)) return n;
        throw new ArgumentOutOfRangeException(nameof(child), child, "The root and unknown children have no parent.");
    }

    /// <summary>The alternatives below a node, in their own order.</summary>
    public ImmutableArray<int> AlternativesUnder(int node)
    {
        var found = new SortedSet<int>();
        Gather(node);
        return [.. found];

        void Gather(int n)
        {
            foreach (var child in Nodes[n].Children)
                if (IsAlternative(child)) found.Add(child);
                else Gather(child - Alternatives.Length);
        }
    }
}

/// <summary>An inner node of the tree: a nest, or the root.</summary>
/// <param name="Name">The nest's name; empty for the root.</param>
/// <param name="Children">Child numbers: alternatives below J, inner nodes from J on.</param>
/// <param name="Dissimilarity">Fixed value (1 for the root); null when it is a parameter.</param>
/// <param name="Owner">Index of the node that owns the parameter: its own index, or that of the nest named by <c>same_as</c>.</param>
public sealed record NestNode(string Name, ImmutableArray<int> Children, double? Dissimilarity, int Owner);
