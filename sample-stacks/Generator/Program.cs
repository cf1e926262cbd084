using Stacks.SampleStacks;

if (args.Length != 1)
{
    Console.Error.WriteLine("usage: dotnet run -c Release --project sample-stacks/Generator -- FOLDER");
    return 64;
}

Directory.CreateDirectory(args[0]);
Samples.WriteAll(args[0]);
return 0;
